"""``winze`` and ``winze FILE``: the workbench, where there is a terminal for it."""

from __future__ import annotations

import os
import sys
from pathlib import Path

from tui.diagnostics import CallError

HEADLESS = (
    "winze report FILE, winze levels FILE, winze spectrum FILE and winze profile FILE need none"
)


def open_workbench(file: str | None) -> int:
    """Open a file, or the demo design.

    Raises
    ------
    CallError
        There is no terminal that the workbench could use.
    """
    streams = (sys.stdin, sys.stdout)
    if not all(stream is not None and stream.isatty() for stream in streams):
        raise CallError(f"the workbench needs a terminal; {HEADLESS}")
    if os.environ.get("TERM", "dumb") in ("", "dumb"):
        raise CallError(f"the workbench cannot draw on TERM=dumb; {HEADLESS}")
    from tui.workbench.app import run

    return run(None if file is None else Path(file))
