"""The current view: J over bias in the place of the bands, and what is read off below it."""

from __future__ import annotations

import time

from textual import events

from tui.workbench.bench import HINT, NOTE_WIDTH, PROGRESS_S
from tui.workbench.current_readout import current_lines, report
from tui.workbench.current_state import CurrentState
from tui.workbench.currents import CurveNews, curve_wish
from tui.workbench.panes import CurrentPane, Pane
from tui.workbench.readout import dimmed, level_lines, note_lines, wrapped
from tui.workbench.sheet import Cursor, moved

TALL_FROM = 30
"""Lines from which the read-out has room for more of the device's figures."""
CURRENT_HINT = "? keys   c bands   k j bias   n p feature   l log   O overlays   i figures"
TITLE = "This current in full"
COMPUTING, STOPPED = "the current is being computed; Esc breaks off", "broken off; C computes it"


class CurrentView(CurrentState):
    """What the current view shows."""

    def on_resize(self, event: events.Resize) -> None:
        """Choose how much is read out; what comes into sight is computed."""
        self.set_class(event.size.height >= TALL_FROM, "tall")
        self.call_after_refresh(self.catch_up)

    def switch_view(self) -> None:
        """Show the current for the bands, or the other way round."""
        key = self.field.key
        self.shows_current = not self.shows_current
        self.set_class(self.shows_current, "of-current")
        self.stopped = None
        self.lay_form()
        if self.cursor.row == 0:
            keys = [field.key for field in self.rows[0].fields]
            self.cursor = Cursor(0, keys.index(key) if key in keys else 0)
            self.cursor = moved(self.cursor, self.rows, 0, 0)
        self.say(CURRENT_HINT if self.shows_current else HINT)
        self.catch_up()
        self.ask_current()
        self.call_after_refresh(self.show_all)

    def show_answer(self) -> None:
        """Show figure, read-out, levels and notes of the view."""
        if not self.shows_current:
            super().show_answer()
            return
        self.show_title()
        self._show_current()
        study, reading = self.study, self.reading
        if study is not None and reading is not None:
            pane = self.query_one("#levels", Pane)
            lines = level_lines(study, reading, pane.content_size.height)
            pane.show(dimmed(lines) if self.trouble else lines)
        pane = self.query_one("#notes", Pane)
        pane.show(note_lines(self.notes(), pane.content_size.width))

    def _show_current(self) -> None:
        figure, pane = self.query_one("#current", CurrentPane), self.query_one("#reading", Pane)
        scene, point = self.scene, self.point()
        if self.current_trouble and (scene is None or self.structure is not None):
            figure.say(self.current_trouble, "trouble")
            pane.show([])
        elif scene is None:
            figure.say(STOPPED if self.stopped else COMPUTING, "faint")
            pane.show([])
        else:
            figure.draw(scene, self.bias_V, point, is_old=self.is_old)
            branches = () if figure.base is None else figure.base.branches
            size = pane.size
            lines = current_lines(scene.sweep, branches, point, size.width, size.height)
            pane.show(dimmed(lines) if self.is_old else lines)

    def notes(self) -> list[str]:
        """Give the notes on the answer that is shown."""
        if not self.shows_current:
            return super().notes()
        sweep = None if self.news is None else self.news.sweep
        return [] if sweep is None else list(sweep.notes)

    def notes_in_full(self) -> tuple[str, list[str]]:
        """Give all figures of the current and the notes on it; in the bands theirs."""
        sweep = None if self.news is None else self.news.sweep
        if not self.shows_current:
            return super().notes_in_full()
        if self.current_trouble or sweep is None:
            return TITLE, wrapped(self.current_trouble or "not computed yet", NOTE_WIDTH)
        old = ["This is the current of what was there before.", ""] if self.is_old else []
        return TITLE, [*old, *report(sweep)]

    def answer_state(self) -> str:
        """Say how the curve stands, or the bands' answer."""
        if not self.shows_current:
            return super().answer_state()
        shown = "old curve shown" if self.is_old and self.scene is not None else ""
        if self.wanted is not None:
            news = self.news
            so_far = news if news and news.wish == self.wanted else CurveNews(self.wanted, None)
            waited_s = time.monotonic() - self.wanted_at
            said = so_far.progress + (f", {waited_s:.0f} s" if waited_s > PROGRESS_S else "")
            return "; ".join(part for part in (said, shown) if part)
        if self.stopped == curve_wish(self.session):
            return STOPPED
        if self.current_trouble:
            return shown or "no current"
        count = len(self.notes())
        return f"{count} note{'s' * (count > 1)}: i" if count else ""
