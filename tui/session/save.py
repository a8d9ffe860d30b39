"""To disk without a moment at which the file is half written."""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Iterable
from pathlib import Path

from tui.session.refusal import SessionError


def save(path: Path, text: str, *, files_only: bool = False) -> None:
    """Write a text to a file, all of it or nothing; see `save_parts`."""
    save_parts(path, [text], files_only=files_only)


def save_parts(path: Path, parts: Iterable[str], *, files_only: bool = False) -> None:
    """Write a text, which comes in parts, to a file, all of it or nothing.

    The text goes to a temporary file in the same folder, is flushed to the disk, and takes the
    file's place in one step; a link is followed, the file's permissions and owner are kept. A
    device or a pipe is written to and never replaced, or refused with ``files_only``: a pipe
    would wait for its reader.

    Raises
    ------
    SessionError
        It could not be written; what was there before is still there.
    """
    try:
        data = (part.encode("utf-8") for part in parts)
        target = path.resolve()
        if target.is_dir():
            raise IsADirectoryError(21, "it is a folder")
        if path.exists() and not path.is_file():
            _write_to_device(path, data, files_only=files_only)
        else:
            _replace(target, data)
    except UnicodeEncodeError as error:
        allowed = "take out the character that UTF-8 cannot hold"
        raise SessionError("", "it cannot be written", allowed, source=str(path)) from error
    except (OSError, RuntimeError, ValueError) as error:  # links in a circle; a NUL in the name
        reason = (getattr(error, "strerror", None) or str(error)).lower()
        allowed = f"{reason}; nothing was changed, save it under another name"
        raise SessionError("", "it cannot be written", allowed, source=str(path)) from error


def _write_to_device(path: Path, data: Iterable[bytes], *, files_only: bool) -> None:
    if files_only:
        raise OSError(22, "it is no regular file")
    with path.open("wb") as file:
        file.writelines(data)


def _replace(target: Path, data: Iterable[bytes]) -> None:
    before = target.stat() if target.exists() else None
    if before is not None and not os.access(target, os.W_OK):
        raise PermissionError(13, "permission denied")
    handle, name = tempfile.mkstemp(prefix=".winze-", dir=target.parent)
    temporary = Path(name)
    try:
        with os.fdopen(handle, "wb") as file:
            file.writelines(data)
            file.flush()
            os.fsync(file.fileno())
        if before is None:
            temporary.chmod(_new_mode())
        else:
            _make_like(temporary, before)
        temporary.replace(target)
    finally:  # after an interrupt too
        temporary.unlink(missing_ok=True)
    _sync_folder(target.parent)


def _make_like(temporary: Path, before: os.stat_result) -> None:
    """Give the new file the old one's owner, where that is allowed, and its permissions."""
    if os.name == "posix":
        with contextlib.suppress(PermissionError):
            os.chown(temporary, before.st_uid, before.st_gid)
    temporary.chmod(before.st_mode & 0o7777)


def _new_mode() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask


def _sync_folder(folder: Path) -> None:
    """Make the folder's new entry last through a power loss, where the system can.

    A folder that may not be listed, or that lies on a network, may refuse; the file is saved.
    """
    if os.name != "posix":
        return
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)
