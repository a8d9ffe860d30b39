"""The current curve of a session at another temperature, to be laid over its own."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

from physics.curve import Curve, own_curve
from physics.field import go_on
from tui.session.model import Session
from tui.session.resolve import resolve
from tui.sweep import drive_of


@dataclass(frozen=True, eq=False)
class Overlay:
    """A temperature and its curve."""

    temperature_K: float
    curve: Curve


def overlay(
    session: Session,
    temperature_K: float,
    range_V: tuple[float, float],
    watch: Callable[[], None] = go_on,
) -> Overlay:
    """Compute a session's curve at a temperature, over a given range; see `tui.sweep.sweep`."""
    conditions = replace(session.conditions, temperature_K=temperature_K)
    session = replace(session, conditions=conditions)
    drive, _ = drive_of(session, resolve(session), range_V, watch)
    return Overlay(temperature_K, own_curve(drive, *range_V))
