"""What the current view is asked for and what has come of it; the bench is below, the look above.

The bias line is the session's own bias, so that the bands follow it. A curve is computed only while
it is looked at.
"""

from __future__ import annotations

import time

from textual.message import Message
from textual.timer import Timer

from tui.bias_point import BiasPoint, point_between
from tui.figures.cells import Glyphs
from tui.figures.current_figure import Scene
from tui.workbench.bench import PROGRESS_S, Bench
from tui.workbench.currents import (
    Currents,
    CurveNews,
    CurveWish,
    News,
    PointNews,
    PointWish,
    curve_wish,
    point_wish,
)
from tui.workbench.document import Document

BANDS_PAUSE_S = 0.1
"""How long the bias line has to rest before the levels beside the current are computed."""


class CurrentState(Bench):
    """Wishes, news, and what is in hand of a current."""

    class Computed(Message):
        """There is news of a curve or of the bias in hand."""

        def __init__(self, news: News) -> None:
            super().__init__()
            self.news = news

    def __init__(self, document: Document, glyphs: Glyphs) -> None:
        super().__init__(document, glyphs)
        self.is_log = False
        self.news: CurveNews | None = None
        self.wanted: CurveWish | None = None
        self.stopped: CurveWish | None = None
        """A wish that was broken off, and is not to be taken up again unasked."""
        self.point_news: PointNews | None = None
        self.wanted_point: PointWish | None = None
        self._scene: Scene | None = None
        self.wanted_at = 0.0
        self._waiting: Timer | None = None
        self._bands_due = False
        self._pausing: Timer | None = None
        self.currents = Currents(self._hand_over)

    def on_unmount(self) -> None:
        """End the computing threads."""
        self.currents.close()

    def take_document(self) -> None:
        """Show a document that was just opened or begun."""
        self.news = self.point_news = self._scene = None
        super().take_document()

    # Asking

    def catch_up(self) -> None:
        """Compute the bands' answer if it is due and seen."""
        if self._bands_due and (self.has_class("wide") or not self.shows_current):
            self._bands_due = False
            super().compute()

    def compute(self) -> None:
        """Ask for the current; for the bands' answer once that is seen, and the moves pause."""
        self._bands_due = self.shows_current
        if not self.shows_current:
            super().compute()
            return
        if self.has_class("wide"):
            if self._pausing is not None:
                self._pausing.stop()
            self._pausing = self.set_timer(BANDS_PAUSE_S, self.catch_up)
        if not self.are_keys_waiting:
            self.all_keys_done()

    def all_keys_done(self) -> None:
        """Compute what was asked for last, the current too where it is looked at."""
        super().all_keys_done()
        self.ask_current()

    def ask_current(self) -> None:
        """Ask for the curve and for the bias in hand, unless both are there or under way."""
        if not self.shows_current or self.structure is None:
            self.drop_current()
            if self.shows_current:
                self.show_answer()
            return
        wish = curve_wish(self.session)
        is_there = self.news is not None and self.news.done and self.news.wish == wish
        if is_there or wish == self.stopped:
            self.drop_current()
        elif wish != self.wanted:
            self.wanted, self.stopped = wish, None
            self.wanted_at = time.monotonic()
            self._show_wait()
            self.currents.curves.ask(wish)
        self._ask_point()
        self.show_answer()

    def _show_wait(self) -> None:
        """Say how long it takes, for as long as it does; nothing ticks otherwise."""
        if self._waiting is not None:
            self._waiting.stop()
        if self.wanted is not None and self.shows_current:
            self.show_title()
            self._waiting = self.set_timer(PROGRESS_S, self._show_wait)

    def _ask_point(self) -> None:
        """Ask for what is at the bias in hand, once its curve's range is known."""
        wish = self._point_wish()
        known = self.point_news is not None and self.point_news.wish == wish
        if wish is not None and not known and wish != self.wanted_point:
            self.wanted_point = wish
            self.currents.points.ask(wish)

    def _point_wish(self) -> PointWish | None:
        sweep = None if self.news is None else self.news.sweep
        if sweep is None or self.is_old or not sweep.from_V <= self.bias_V <= sweep.to_V:
            return None
        return point_wish(self.session, sweep)

    def drop_current(self) -> None:
        """Break off the curve that is being computed."""
        if self.wanted is not None:
            self.wanted = None
            self.currents.curves.drop()

    def _hand_over(self, news: News) -> None:
        # Called in a computing thread; posting is what a thread may do.
        self.post_message(self.Computed(news))

    def on_current_state_computed(self, message: Computed) -> None:
        """Take news, unless something newer has been asked for."""
        news = message.news
        if not self.is_running:
            return
        if isinstance(news, PointNews):
            if news.wish == self.wanted_point:
                self.point_news, self.wanted_point = news, None
                if self.shows_current:
                    self.show_answer()
        elif news.wish == self.wanted:
            self.news = news
            self._ask_point()
            if news.done:
                self.wanted = None
            if self.shows_current:
                self.show_answer()

    @property
    def is_computing(self) -> bool:
        """Whether an answer is being waited for."""
        return any(wish is not None for wish in (self.asked, self.wanted, self.wanted_point))

    @property
    def scene(self) -> Scene | None:
        """What there is to draw."""
        news, scene = self.news, self._scene
        if news is None or news.sweep is None:
            return None
        known = scene is not None and scene.sweep is news.sweep and scene.is_log == self.is_log
        if scene is None or not known or scene.overlays != news.overlays:
            self._scene = Scene(news.sweep, news.overlays, self.is_log)
        return self._scene

    @property
    def is_old(self) -> bool:
        """Whether the curve is that of something else than is there now."""
        if self.structure is None or self.news is None:
            return True
        return self.news.wish != curve_wish(self.session)

    @property
    def current_trouble(self) -> str:
        """Why there is no current of what is there now; empty where there is one."""
        if self.structure is None:
            return self.trouble
        return "" if self.is_old or self.news is None else self.news.trouble

    def point(self) -> BiasPoint | None:
        """Give what is at the bias in hand, read off the curve until it is computed."""
        wish, sweep = self._point_wish(), None if self.news is None else self.news.sweep
        if wish is None or sweep is None:
            return None
        news = self.point_news
        if news is not None and news.point is not None and news.wish == wish:
            return news.point
        return point_between(sweep.curve, self.bias_V)

    @property
    def bias_V(self) -> float:
        """The bias in hand."""
        return self.session.conditions.bias_V
