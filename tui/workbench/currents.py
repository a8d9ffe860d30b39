"""Current curves beside the keys: the session's own, those laid over it, and the bias in hand.

What a curve does not depend on (the bias, the title, the window) is taken out of what is asked, so
that the line moves over a curve that stays; and the last curves are kept, so that undo and a
temperature that was there before cost nothing.
"""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import TypeVar

from physics.curve import Drive
from physics.errors import PhysicsError
from physics.solutions import Solutions
from tui.bias_point import REACH_V, BiasPoint, point_at
from tui.figures.current_figure import OVERLAYS
from tui.overlay import Overlay, overlay
from tui.session.model import Session, SweepEntry, View
from tui.session.read import overlay_temperatures
from tui.session.refusal import SessionError
from tui.session.resolve import resolve
from tui.sweep import Sweep, SweepRequest, drive_of, sweep
from tui.workbench.worker import Watch, Worker

KEPT = 16
"""Curves that are kept of each kind."""
MOST_SOLUTIONS = 400
"""Solutions of Poisson's equation that are kept for the bias in hand."""
KeptT = TypeVar("KeptT", Sweep, Overlay)
NO_MEMORY = "there is not enough memory for this design"


@dataclass(frozen=True)
class CurveWish:
    """A session without what its curve does not depend on, and the temperatures laid over it."""

    session: Session
    overlays_K: tuple[float, ...]


@dataclass(frozen=True, eq=False)
class CurveNews:
    """What there is of a wish so far, or why there is none."""

    wish: CurveWish
    sweep: Sweep | None
    overlays: tuple[Overlay, ...] = ()
    done: bool = False
    trouble: str = ""

    @property
    def progress(self) -> str:
        """Say how far it is: which curve, or how many points of the first."""
        count = len(self.wish.overlays_K) + 1
        at = 1
        points = 0 if self.sweep is None else self.sweep.curve.bias_V.size
        if self.sweep is not None and self.sweep.refined:
            at, points = min(len(self.overlays) + 2, count), 0
        said = f"current {at} of {count}" if count > 1 else "computing the current"
        return said + (f", {points} points" if points else "")


@dataclass(frozen=True)
class PointWish:
    """A session, the range of its curve, and the bias in hand."""

    session: Session
    range_V: tuple[float, float]
    bias_V: float


@dataclass(frozen=True, eq=False)
class PointNews:
    """What is there, or None where it cannot be computed."""

    wish: PointWish
    point: BiasPoint | None


News = CurveNews | PointNews


def curve_wish(session: Session) -> CurveWish:
    """Ask for a session's curves."""
    temperatures = overlay_temperatures(session.sweep.overlay_K) or ()
    own = session.conditions.temperature_K
    others = tuple(T for T in dict.fromkeys(temperatures) if T != own)
    ranged = SweepEntry(session.sweep.from_V, session.sweep.to_V)
    return CurveWish(replace(_bare(session), sweep=ranged), others[: len(OVERLAYS)])


def point_wish(session: Session, found: Sweep) -> PointWish:
    """Ask for what is at a session's bias, in the range of its curve."""
    bare = replace(_bare(session), sweep=SweepEntry())
    return PointWish(bare, (found.from_V, found.to_V), session.conditions.bias_V)


def _bare(session: Session) -> Session:
    conditions = replace(session.conditions, bias_V=0.0)
    return replace(session, title="", notes="", conditions=conditions, view=View())


class Currents:
    """Two threads: one for curves, one for the bias in hand, which does not wait for them."""

    def __init__(self, deliver: Callable[[News], None]) -> None:
        self._deliver = deliver
        self._sweeps: OrderedDict[object, Sweep] = OrderedDict()
        self._overlays: OrderedDict[object, Overlay] = OrderedDict()
        self._drive: tuple[object, Drive, Solutions | None] | None = None
        self.curves: Worker[CurveWish] = Worker("winze-currents", self._curves)
        self.points: Worker[PointWish] = Worker("winze-point", self._point)

    def close(self) -> None:
        """End both threads."""
        self.curves.close()
        self.points.close()

    def _curves(self, wish: CurveWish, watch: Watch) -> None:
        try:
            self._answer(wish, watch)
        except (SessionError, PhysicsError) as error:
            self._deliver(CurveNews(wish, None, done=True, trouble=str(error)))
        except MemoryError:
            self._deliver(CurveNews(wish, None, done=True, trouble=NO_MEMORY))

    def _answer(self, wish: CurveWish, watch: Watch) -> None:
        session = wish.session
        _require_range(session)

        def tell(first: Sweep) -> None:
            watch()
            self._deliver(CurveNews(wish, first))

        own = self._sweeps.get(session)
        if own is None:
            own = _kept(self._sweeps, session, sweep(SweepRequest(session), watch, tell))
        over: tuple[Overlay, ...] = ()
        range_V = own.from_V, own.to_V
        for temperature in wish.overlays_K:
            self._deliver(CurveNews(wish, own, over))
            watch()
            key = session, temperature, range_V
            known = self._overlays.get(key)
            if known is None:
                made = overlay(session, temperature, range_V, watch)
                known = _kept(self._overlays, key, made)
            over = (*over, known)
        self._deliver(CurveNews(wish, own, over, done=True))

    def _point(self, wish: PointWish, watch: Watch) -> None:
        try:
            point = point_at(self._drive_for(wish, watch), wish.bias_V)
        except (SessionError, PhysicsError, MemoryError):
            self._deliver(PointNews(wish, None))  # the curve says why
        else:
            self._deliver(PointNews(wish, point))

    def _drive_for(self, wish: PointWish, watch: Watch) -> Drive:
        """Keep the drive, and with it the solutions near which others are found quickly."""
        key = wish.session, wish.range_V
        if self._drive is not None and self._drive[0] == key:
            _, drive, solutions = self._drive
            if solutions is None or len(solutions.known) < MOST_SOLUTIONS:
                return drive
        low, high = wish.range_V
        reach = low - REACH_V, high + REACH_V
        drive, solutions = drive_of(wish.session, resolve(wish.session), reach, watch)
        self._drive = key, drive, solutions
        return drive


def _require_range(session: Session) -> None:
    """Refuse an empty range in the form's own words."""
    start, stop = session.sweep.from_V or 0.0, session.sweep.to_V
    if stop is not None and not start < stop:
        allowed = "the bias goes from a lower to a higher one; change from V or to V"
        raise SessionError("", f"the range from {start:g} to {stop:g} V is empty", allowed)


def _kept(store: OrderedDict[object, KeptT], key: object, made: KeptT) -> KeptT:
    """Keep what was made, and let the oldest go."""
    store[key] = made
    while len(store) > KEPT:
        store.popitem(last=False)
    return made
