"""Time from a key press to the redrawn figure, in a pseudo-terminal, and the bytes it sends.

Run it from the top of a checkout::

    python tests/benchmarks/keypress.py [FILE]

The workbench runs in a pseudo-terminal of 110 x 35 cells on the demo design or a file. Each key is
sent when all is quiet; the time stops with the last byte of the burst of output that answers it.
"""

from __future__ import annotations

import fcntl
import os
import pty
import select
import statistics
import struct
import sys
import termios
import time
from pathlib import Path

TOP = Path(__file__).resolve().parents[2]
COLUMNS, ROWS = 110, 35
QUIET_S = 0.25
KEYS = {
    "step a thickness": [b"+", b"-"] * 20,
    "next level": [b"n", b"p"] * 20,
    "energy line": [b"k", b"j"] * 20,
    "form cursor": [b"\x1b[B", b"\x1b[A"] * 20,
}
CURRENT_KEYS = {
    "bias line": [b"k", b"j"] * 20,
    "next peak or valley": [b"n", b"p"] * 20,
}
CURRENT_S = 6.0
"""Time that the demo's current is given."""


def start() -> tuple[int, int]:
    """Start the workbench in a pseudo-terminal; give its process and terminal."""
    pid, terminal = pty.fork()
    if pid == 0:
        os.chdir(TOP)
        os.environ.update(TERM="xterm-256color", COLORTERM="", LINES="", COLUMNS="")
        del os.environ["LINES"], os.environ["COLUMNS"]
        command = [sys.executable, "-m", "tui.command.entry", *sys.argv[1:2]]
        os.execv(sys.executable, command)  # noqa: S606
    fcntl.ioctl(terminal, termios.TIOCSWINSZ, struct.pack("HHHH", ROWS, COLUMNS, 0, 0))
    return pid, terminal


def burst(terminal: int, quiet_s: float = QUIET_S) -> tuple[float, int]:
    """Read until nothing comes for a while; give the time of the last byte and their number."""
    last, count = time.perf_counter(), 0
    while select.select([terminal], [], [], quiet_s)[0]:
        try:
            count += len(os.read(terminal, 65536))
        except OSError:  # the workbench has left
            break
        last = time.perf_counter()
    return last, count


def main() -> None:
    """Press keys and print what was measured."""
    begun = time.perf_counter()
    _, terminal = start()
    shown, size = burst(terminal, 1.5)
    print(f"start to full first screen: {shown - begun:.2f} s, {size} bytes")
    os.write(terminal, b"\x1b[B" * 2)
    burst(terminal)
    press(terminal, KEYS)
    os.write(terminal, b"c")
    burst(terminal, CURRENT_S)
    press(terminal, CURRENT_KEYS)
    os.write(terminal, b"qd")
    burst(terminal, 0.5)


def press(terminal: int, groups: dict[str, list[bytes]]) -> None:
    """Press the keys of each group and print how long the answers take."""
    for name, keys in groups.items():
        times, sizes = [], []
        for key in keys:
            pressed = time.perf_counter()
            os.write(terminal, key)
            last, size = burst(terminal)
            times.append(1e3 * (last - pressed))
            sizes.append(size)
        times.sort()
        print(
            f"{name}: median {statistics.median(times):.0f} ms, "
            f"95th percentile {times[int(0.95 * len(times)) - 1]:.0f} ms, "
            f"{statistics.median(sizes):.0f} bytes"
        )


if __name__ == "__main__":
    main()
