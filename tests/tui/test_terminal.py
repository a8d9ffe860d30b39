"""The workbench in a pseudo-terminal, read by a terminal emulator."""

from __future__ import annotations

import fcntl
import os
import pty
import select
import signal
import struct
import sys
import termios
import time
from collections.abc import Iterator
from pathlib import Path

import pyte
import pytest

TOP = Path(__file__).parents[2]
LEAVES_SCREEN = b"\x1b[?1049l"
SHOWS_CURSOR = b"\x1b[?25h"
MOUSE_ON = b"\x1b[?1000h"


class Terminal:
    """A child process behind a pseudo-terminal, and what it has drawn."""

    def __init__(self, columns: int, rows: int, *arguments: str, **environment: str) -> None:
        self.screen = pyte.Screen(columns, rows)
        self.stream = pyte.ByteStream(self.screen)
        self.raw = b""
        self.pid, self.end = pty.fork()
        if self.pid == 0:
            os.chdir(TOP)
            kept = {k: v for k, v in os.environ.items() if k not in ("COLUMNS", "LINES")}
            command = [sys.executable, "-m", "tui.command.entry", *arguments]
            os.execve(sys.executable, command, kept | environment)  # noqa: S606
        fcntl.ioctl(self.end, termios.TIOCSWINSZ, struct.pack("HHHH", rows, columns, 0, 0))
        self.status: int | None = None

    def read(self, seconds: float = 0.1) -> bytes:
        fresh = b""
        while select.select([self.end], [], [], seconds)[0]:
            try:
                part = os.read(self.end, 65536)
            except OSError:  # the child has gone
                break
            if not part:
                break
            fresh += part
        self.raw += fresh
        self.stream.feed(fresh)
        return fresh

    def until(self, text: str, seconds: float = 15.0) -> str:
        limit = time.monotonic() + seconds
        while time.monotonic() < limit:
            self.read()
            shown = "\n".join(self.screen.display)
            if text in shown:
                return shown
        raise AssertionError("\n".join(self.screen.display))

    def press(self, keys: str) -> None:
        os.write(self.end, keys.encode())

    def wait(self, seconds: float = 10.0) -> int:
        limit = time.monotonic() + seconds
        while time.monotonic() < limit:
            self.read(0.05)
            pid, status = os.waitpid(self.pid, os.WNOHANG)
            if pid:
                self.status = os.waitstatus_to_exitcode(status)
                self.read(0.05)
                return self.status
        raise AssertionError("still running")

    def close(self) -> None:
        if self.status is None:
            os.kill(self.pid, signal.SIGKILL)
            os.waitpid(self.pid, 0)
        os.close(self.end)


@pytest.fixture
def terminals() -> Iterator[list[Terminal]]:
    opened: list[Terminal] = []
    yield opened
    for terminal in opened:
        terminal.close()


UTF8 = {"LANG": "C.UTF-8", "LC_ALL": "C.UTF-8", "NO_COLOR": ""}


def test_edit_save_and_quit(terminals: list[Terminal], tmp_path: Path) -> None:
    design = tmp_path / "d.toml"
    design.write_bytes((TOP / "tui" / "session" / "demo.toml").read_bytes())
    t = Terminal(80, 24, str(design), TERM="xterm-256color", **UTF8)
    terminals.append(t)
    t.until("proved complete")
    t.press("\x1b[B\x1b[B\x1b[C+")
    t.until("23.00")
    t.press("w")
    t.until("saved")
    t.press("q")
    assert t.wait() == 0
    assert "thickness_ml = 23" in design.read_text(encoding="utf-8")
    assert LEAVES_SCREEN in t.raw
    assert SHOWS_CURSOR in t.raw
    assert MOUSE_ON not in t.raw  # the terminal's own selection stays


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGHUP])
def test_a_signal_leaves_the_terminal_clean(terminals: list[Terminal], number: int) -> None:
    t = Terminal(80, 24, TERM="xterm-256color", **UTF8)
    terminals.append(t)
    t.until("proved complete")
    os.kill(t.pid, number)
    assert t.wait() == 128 + number
    assert LEAVES_SCREEN in t.raw
    assert SHOWS_CURSOR in t.raw
    assert b"Traceback" not in t.raw


@pytest.mark.parametrize(
    "environment",
    [
        {"TERM": "linux", "LANG": "C.UTF-8", "LC_ALL": "C.UTF-8"},
        {"TERM": "xterm", "LANG": "C", "LC_ALL": "C"},
        {"TERM": "xterm", "LANG": "", "LC_ALL": "", "LC_CTYPE": ""},
    ],
)
def test_plain_characters_where_the_terminal_has_no_others(
    terminals: list[Terminal], environment: dict[str, str]
) -> None:
    t = Terminal(80, 24, **environment)
    terminals.append(t)
    shown = t.until("proved complete")
    assert shown.isascii()
    t.press("?")
    assert t.until("one row up").isascii()


def codes(raw: bytes) -> set[bytes]:
    """Find the numbers of what sets colours and the like."""
    return {
        code
        for part in raw.split(b"\x1b[")[1:]
        if b"m" in part[:24] and part[: part.index(b"m")].replace(b";", b"").isdigit()
        for code in part[: part.index(b"m")].split(b";")
    }


def test_no_colour(terminals: list[Terminal]) -> None:
    t = Terminal(80, 24, TERM="xterm-256color", LANG="C.UTF-8", LC_ALL="C.UTF-8", NO_COLOR="1")
    terminals.append(t)
    t.until("proved complete")
    colours = {*range(30, 39), *range(40, 49), *range(90, 98), *range(100, 108)}
    assert not {int(code) for code in codes(t.raw)} & colours
    cursor = [c for row in t.screen.buffer.values() for c in row.values() if c.reverse]
    assert cursor  # the form's cursor is seen without colour


def test_no_traffic_while_nothing_happens(terminals: list[Terminal]) -> None:
    t = Terminal(110, 35, TERM="xterm-256color", **UTF8)
    terminals.append(t)
    t.until("proved complete")
    t.read(1.0)
    assert t.read(1.5) == b""


def test_resizing(terminals: list[Terminal]) -> None:
    t = Terminal(80, 24, TERM="xterm-256color", **UTF8)
    terminals.append(t)
    t.until("proved complete")
    t.screen.resize(50, 200)
    fcntl.ioctl(t.end, termios.TIOCSWINSZ, struct.pack("HHHH", 50, 200, 0, 0))
    os.kill(t.pid, signal.SIGWINCH)
    t.until("mainly in")
    t.screen.resize(20, 58)
    fcntl.ioctl(t.end, termios.TIOCSWINSZ, struct.pack("HHHH", 20, 58, 0, 0))
    os.kill(t.pid, signal.SIGWINCH)
    t.until("winze needs")


def test_redrawn_after_the_shell_had_the_screen(terminals: list[Terminal]) -> None:
    t = Terminal(80, 24, TERM="xterm-256color", **UTF8)
    terminals.append(t)
    t.until("proved complete")
    t.read(0.5)
    before = t.screen.display[:]
    t.screen.reset()
    t.press("\x0c")
    t.read(0.5)
    assert t.screen.display == before
    os.kill(t.pid, signal.SIGTSTP)
    t.read(0.5)
    assert LEAVES_SCREEN in t.raw
    t.screen.reset()
    os.kill(t.pid, signal.SIGCONT)
    t.read(0.8)
    assert t.screen.display == before


@pytest.mark.parametrize(
    ("burst", "shown"),
    [
        ("3.25\r", "3.2500"),
        ("47\x7f.2\x7f5\r+", "4.7827"),  # 4.5 nm and a monolayer
        ("e\x15.0875\rn", "level 2  245"),
        ("q\x1b", "q quit"),
        ("+q", "unsaved changes"),
    ],
)
def test_what_comes_at_once_is_taken_in_turn(
    terminals: list[Terminal], burst: str, shown: str
) -> None:
    t = Terminal(80, 24, TERM="xterm-256color", **UTF8)
    terminals.append(t)
    t.until("proved complete")
    t.read(0.3)
    t.press(burst)
    t.until(shown, 5.0)


def test_a_burst_may_quit(terminals: list[Terminal]) -> None:
    t = Terminal(80, 24, TERM="xterm-256color", **UTF8)
    terminals.append(t)
    t.until("proved complete")
    t.press("+++qd")
    assert t.wait() == 0


def test_a_slow_link_is_not_flooded(terminals: list[Terminal]) -> None:
    t = Terminal(110, 35, TERM="xterm-256color", **UTF8)
    terminals.append(t)
    t.until("proved complete")
    t.read(0.5)
    before = len(t.raw)
    for _ in range(60):  # nothing is read meanwhile: the link is as slow as can be
        t.press("+")
        time.sleep(0.03)
    t.until("21.95", 5.0)  # 5 nm and 60 monolayers
    assert len(t.raw) - before < 60_000


@pytest.mark.parametrize("term", ["linux", "xterm-256color"])
def test_the_current_needs_no_colour_and_is_quiet_when_done(
    terminals: list[Terminal], term: str
) -> None:
    t = Terminal(80, 24, TERM=term, LANG="C", LC_ALL="C", NO_COLOR="1")
    terminals.append(t)
    t.until("proved complete")
    t.press("c")
    shown = t.until("ratio", 30.0)
    assert shown.isascii()
    for said in ("P1", "V1", "level", "bias V", "J "):
        assert said in shown
    t.press("lkkn")
    t.until("1e4")
    t.read(1.0)
    assert t.read(1.5) == b""
    colours = {*range(30, 39), *range(40, 49), *range(90, 98), *range(100, 108)}
    assert not {int(code) for code in codes(t.raw)} & colours
    t.press("cq")
    t.until("unsaved changes")  # the bias has moved
    t.press("d")
    assert t.wait() == 0
