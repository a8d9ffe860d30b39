"""Texts and files made to hang, to flood or to lock out: a short refusal each, and soon."""

from __future__ import annotations

import os
import stat
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path

import pytest

from tui.session import save as saving
from tui.session.demo import demo_text
from tui.session.lines import MOST_PARTS, line_of, tangled
from tui.session.read import load, read_session
from tui.session.refusal import SessionError, has_controls
from tui.session.save import save

TOP = Path(__file__).parents[2]
LONGEST_MESSAGE = 400
NOBODY = 65534


def refusal(text: str) -> SessionError:
    with pytest.raises(SessionError) as caught:
        read_session(text, "x.toml")
    assert len(str(caught.value)) < LONGEST_MESSAGE
    assert not has_controls(str(caught.value))
    return caught.value


@pytest.mark.parametrize(
    ("text", "line", "said"),
    [
        ("format = 1\ntitle" + ".a" * 500_000 + " = 1", 2, "more than 64 parts"),
        ("format = 1\n" + "a." * 500_000, 2, "more than 64 parts"),
        ("format = 1\n[" + '"a" . ' * 300_000 + "a]", 2, "more than 64 parts"),
        ("format = 1\ntitle" + ".a" * (MOST_PARTS - 1) + " = 1", 2, "title is a table"),
        ("format = 1\ntitle = " + "[" * 200 + "]" * 200, 2, "title is a list"),
        ("format = 1\ntitle = " + "[" * 500_000, None, "nested too deep"),
        ("format = 1\ntitle = " + "{a=" * 500_000, None, "nested too deep"),
        ("format = 1\n" + "k" * 1_900_000 + " = 1", 2, "is not known"),
        ("format = 1\ntitle = 1" + "0" * 1_900_000, None, "cannot be read"),
        ("format = 1\ntitle = 0x1" + "0" * 1_900_000, 2, "too long to be shown"),
        ("format = 1\ntitle = '" + "a" * 1_900_000, None, "no TOML"),
        ('format = 1\ntitle = """' + '\n\\"""' * 300_000, None, "no TOML"),
        ('format = 1\n"" = 1', 2, '"" is not known'),
        ('format = 1\n"a\\u001b[2J" = 1', 2, "is not known"),
        ("format = 1\na.b.c = 1", 2, "a is not known"),
    ],
    ids=lambda value: str(value)[:30],
)
def test_texts_that_are_made_to_hang_or_flood(text: str, line: int | None, said: str) -> None:
    error = refusal(text)
    assert error.line == line
    assert said in str(error)


def test_a_long_name_is_cut_short() -> None:
    text = demo_text() + f"\n[material.{'k' * 1_000_000}]\nmass = 1\n"
    assert "kkk... has no edge_eV" in str(refusal(text))
    error = refusal(demo_text().replace("GaAs", "G" * 1_000_000 + "\\u0007", 1))
    assert error.key == "left material"


def test_prose_is_no_key() -> None:
    """Many full stops, leaders, paths and numbers."""
    notes = "One. Two, three. " * 200 + "." * 300 + "/a.b" * 300 + "1.5 " * 300 + "a.b.c = 1"
    text = demo_text().replace('"""\nAim', f'"""{notes}\nAim', 1)
    assert read_session(text, "x").notes.startswith("One.")
    assert tangled("a." * (MOST_PARTS - 1) + "a = 1") is None
    assert tangled("\n\n" + "a." * MOST_PARTS + "a = 1") == 3


def test_names_in_quotation_marks_have_their_line() -> None:
    text = demo_text() + '\n[material."a\\"b"]\nmass = 1\nedge_eV = 999\n'
    assert refusal(text).line == text.count("\n")
    assert line_of(text, ("material",)) == text.count("\n") - 2


@pytest.mark.parametrize("device", ["/dev/zero", "/dev/null"])
def test_devices_are_not_read(device: str) -> None:
    with pytest.raises(SessionError, match="give - for its name"):
        load(Path(device))


def test_a_pipe_from_the_shell_is_told_the_way() -> None:
    command = f"{sys.executable} -m tui.command.entry levels <(cat tui/session/demo.toml)"
    done = subprocess.run(
        ["bash", "-c", command], capture_output=True, text=True, check=False, cwd=TOP, timeout=60
    )
    assert (done.returncode, done.stdout) == (2, "")
    assert "send it to standard input and give - for its name" in done.stderr


@pytest.fixture
def open_folder() -> Iterator[Path]:
    """Give a folder that everybody may enter, unlike pytest's own."""
    with tempfile.TemporaryDirectory() as name:
        Path(name).chmod(0o755)
        yield Path(name)


def as_nobody(call: str) -> str:
    """Make a call without the rights of root, to whom no file is closed; give what it raised."""
    program = (
        "import os, sys\n"
        "from pathlib import Path\n"
        "from tui.session.read import load\n"
        "from tui.session.refusal import SessionError\n"
        "from tui.session.save import save\n"
        "b'x'.decode('utf-8-sig')  # what is loaded late may be closed to nobody\n"
        "if os.geteuid() == 0:\n"
        f"    os.setgroups([]); os.setgid({NOBODY}); os.setuid({NOBODY})\n"
        "try:\n"
        f"    {call}\n"
        "except SessionError as error:\n"
        "    print(error)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=False, cwd=TOP
    )
    assert done.stderr == ""
    return done.stdout


def test_files_that_may_not_be_read(open_folder: Path) -> None:
    path = open_folder / "a.toml"
    path.write_text(demo_text(), encoding="utf-8")
    path.chmod(0o644)
    call = f"load(Path({str(path)!r}))"
    assert as_nobody(call) == ""
    path.chmod(0o000)
    assert as_nobody(call) == f"{path}: it cannot be read; permission denied\n"
    path.chmod(0o644)
    open_folder.chmod(0o000)
    assert as_nobody(call) == f"{path}: it cannot be read; permission denied\n"
    open_folder.chmod(0o755)


def test_files_and_folders_that_may_not_be_written(open_folder: Path) -> None:
    path = open_folder / "a.toml"
    path.write_text("old")
    owner = NOBODY if os.geteuid() == 0 else os.geteuid()
    for writable, mode in ((open_folder, 0o444), (path, 0o644)):  # the file, then its folder
        for place in (open_folder, path):
            os.chown(place, owner, -1)
        path.chmod(mode)
        open_folder.chmod(0o755 if writable is open_folder else 0o555)
        said = as_nobody(f"save(Path({str(path)!r}), 'new')")
        assert said.startswith(f"{path}: it cannot be written; permission denied; nothing was")
        assert path.read_text() == "old"
        assert os.listdir(open_folder) == ["a.toml"]
    open_folder.chmod(0o755)


def test_a_folder_that_may_be_entered_but_not_listed(open_folder: Path) -> None:
    """The file is saved there, and nobody says that it was not."""
    os.chown(open_folder, NOBODY if os.geteuid() == 0 else os.geteuid(), -1)
    open_folder.chmod(0o300)
    assert as_nobody(f"save(Path({str(open_folder / 'a.toml')!r}), 'new')") == ""
    open_folder.chmod(0o700)
    assert (open_folder / "a.toml").read_text() == "new"


def test_a_folder_that_cannot_be_flushed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Some network file systems refuse to flush a folder; the file is there all the same."""
    flush, flushed = os.fsync, []

    def fsync(handle: int) -> None:
        if stat.S_ISDIR(os.fstat(handle).st_mode):
            raise OSError(22, "Invalid argument")
        flushed.append(handle)
        flush(handle)

    monkeypatch.setattr(saving.os, "fsync", fsync)
    save(tmp_path / "a.toml", "new")
    assert (tmp_path / "a.toml").read_text() == "new"
    assert len(flushed) == 1


def test_a_save_keeps_the_owner_and_group(tmp_path: Path) -> None:
    path = tmp_path / "a.toml"
    path.write_text("old")
    owner = (12345, 23456) if os.geteuid() == 0 else (os.geteuid(), os.getegid())
    os.chown(path, *owner)
    path.chmod(0o660)
    save(path, "new")
    after = path.stat()
    assert (after.st_uid, after.st_gid, after.st_mode & 0o7777) == (*owner, 0o660)
