"""To disk without a moment at which the file is half written."""

from __future__ import annotations

import contextlib
import os
import tempfile
from pathlib import Path

from tui.session.refusal import SessionError


def save(path: Path, text: str) -> None:
    """Write a text to a file, all of it or nothing.

    The text goes to a temporary file in the same folder, is flushed to the disk, and takes the
    file's place in one step; a link is followed and the file's permissions are kept.

    Raises
    ------
    SessionError
        It could not be written; what was there before is still there.
    """
    try:
        target = path.resolve()
        if target.is_dir():
            raise IsADirectoryError(21, "it is a folder")
        _replace(target, text.encode("utf-8"))
    except OSError as error:
        reason = (error.strerror or type(error).__name__).lower()
        allowed = f"{reason}; nothing was changed, save it under another name"
        raise SessionError("", "it cannot be written", allowed, source=str(path)) from error
    except UnicodeEncodeError as error:
        allowed = "take out the character that UTF-8 cannot hold"
        raise SessionError("", "it cannot be written", allowed, source=str(path)) from error


def _replace(target: Path, data: bytes) -> None:
    mode = target.stat().st_mode & 0o7777 if target.exists() else None
    if mode is not None and not os.access(target, os.W_OK):
        raise PermissionError(13, "permission denied")
    handle, temporary = tempfile.mkstemp(prefix=".winze-", dir=target.parent)
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(data)
            file.flush()
            os.fsync(file.fileno())
        Path(temporary).chmod(_new_mode() if mode is None else mode)
        Path(temporary).replace(target)
    except OSError:
        with contextlib.suppress(FileNotFoundError):
            Path(temporary).unlink()
        raise
    _sync_folder(target.parent)


def _new_mode() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask


def _sync_folder(folder: Path) -> None:
    """Make the folder's new entry last through a power loss, where the system can."""
    if os.name != "posix":
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
