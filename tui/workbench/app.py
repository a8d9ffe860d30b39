"""The workbench: start it, and leave the terminal as it was, however it ends."""

from __future__ import annotations

import asyncio
import gc
import os
import signal
import sys
from pathlib import Path

# Before Textual is imported, which reads them once: few frames on a slow link, no animation, and
# the terminal's own colours, so that NO_COLOR sends none and light backgrounds stay light.
os.environ.setdefault("TEXTUAL_FPS", "30")
os.environ.setdefault("TEXTUAL_ANIMATIONS", "none")
os.environ.setdefault("TEXTUAL_SMOOTH_SCROLL", "0")
os.environ["TEXTUAL_THEME"] = "ansi-dark"

from tui.workbench import document as documents
from tui.workbench.current_actions import CurrentActions
from tui.workbench.file_actions import FileActions
from tui.workbench.form_actions import FormActions
from tui.workbench.look import glyphs_for_terminal

SIGNALLED = 128


class Workbench(FormActions, CurrentActions, FileActions):
    """The whole application."""

    def on_mount(self) -> None:
        """Begin, and leave on signals in good order."""
        super().on_mount()
        # What is loaded by now stays: looking through it again and again would cost frames.
        gc.collect()
        gc.freeze()
        # Back from the shell, which has drawn over everything.
        self.app_resume_signal.subscribe(self, lambda _: self.action_redraw())
        loop = asyncio.get_running_loop()
        for number in (signal.SIGTERM, signal.SIGHUP):
            loop.add_signal_handler(number, self._end, number)

    def _end(self, number: int) -> None:
        self.exit(SIGNALLED + number)


def run(path: Path | None) -> int:
    """Open a file, or the demo design, in the workbench.

    Returns
    -------
    int
        The exit status.

    Raises
    ------
    SessionError
        The file is refused.
    """
    # The solver's thread gives way within a millisecond: keys and drawing don't wait for it.
    sys.setswitchinterval(1e-3)
    document = documents.demo() if path is None else documents.opened(path)
    app = Workbench(document, glyphs_for_terminal())
    status = app.run(mouse=False)
    return app.return_code or 1 if status is None else status
