"""Results by name: what scans record, specifications bound and aims want.

``level 2 energy_eV`` (or ``width_eV``, ``log10_width_eV``, ``lifetime_s``, ``left_width_eV``,
``right_width_eV``, ``peak_transmission``, ``balance``) of the level with that number in the
session's window, as ``winze levels`` numbers them; ``balance`` is the smaller partial width over
the larger one. ``peak bias_V``, ``peak current_density_A_per_cm2``, ``valley ...``,
``peak_to_valley``, ``onset_V``, and the figures of the device, ``device peak_kA_per_cm2`` and the
like. What is not there (a level out of the window, a curve without a valley) is nan.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, fields

from physics.device import Figures
from physics.field import go_on
from physics.levels import Level, LevelSet, find_levels
from tui.session.lines import KeyPath
from tui.session.model import Session
from tui.session.refusal import SessionError, printable
from tui.study import Request, set_scene
from tui.sweep import Sweep, SweepRequest, sweep

LEVEL_KEYS = (
    "energy_eV",
    "width_eV",
    "log10_width_eV",
    "lifetime_s",
    "left_width_eV",
    "right_width_eV",
    "peak_transmission",
)
BALANCE = "balance"
POINT_KEYS = ("bias_V", "current_density_A_per_cm2")
CURVE_KEYS = ("peak_to_valley", "onset_V")
DEVICE_KEYS = tuple(field.name for field in fields(Figures) if field.name != "cutoff_said")


@dataclass(frozen=True)
class Outcome:
    """One result."""

    text: str
    """As it was named."""
    of: str
    """``level``, ``peak``, ``valley``, ``curve`` or ``device``."""
    number: int
    """Of the level, from 1; 0 for others."""
    key: str

    @property
    def needs_curve(self) -> bool:
        """Whether the current curve has to be computed for it."""
        return self.of != "level"


def outcome(text: str, path: KeyPath = ()) -> Outcome:
    """Find a result by its name.

    Parameters
    ----------
    path : tuple
        Where in the session text the name stands, for a refusal.

    Raises
    ------
    SessionError
        No result goes by that name.
    """
    words = text.split()
    match words:
        case ["level", number, key] if number.isascii() and number.isdigit() and int(number) > 0:
            if key in (*LEVEL_KEYS, BALANCE):
                return Outcome(text, "level", int(number), key)
            raise _refused(text, f"a level has {', '.join((*LEVEL_KEYS, BALANCE))}", path)
        case [("peak" | "valley") as of, key] if key in POINT_KEYS:
            return Outcome(text, of, 0, key)
        case [key] if key in CURVE_KEYS:
            return Outcome(text, "curve", 0, key)
        case ["device", key] if key in DEVICE_KEYS:
            return Outcome(text, "device", 0, key)
        case _:
            allowed = (
                'write it as "level 1 energy_eV", "peak bias_V", "valley '
                'current_density_A_per_cm2", "peak_to_valley", "onset_V" or "device cutoff_Hz"'
            )
            raise _refused(text, allowed, path)


@dataclass(frozen=True, eq=False)
class Answer:
    """What a session's outcomes are."""

    values: tuple[float, ...]
    """In the order asked for; nan where there is no such thing."""
    reached: bool
    """Whether every accuracy was reached and the levels' count proved."""
    levels: LevelSet | None
    sweep: Sweep | None


def evaluate(
    session: Session, wanted: Sequence[Outcome], watch: Callable[[], None] = go_on
) -> Answer:
    """Compute results of a session, and no more than they need.

    Raises
    ------
    SessionError, PhysicsError
        The session does not describe something that can be computed.
    """
    levels, curve, reached = None, None, True
    if any(not one.needs_curve for one in wanted):
        scene = set_scene(Request(session), watch)
        levels = find_levels(scene.profile, scene.from_eV, scene.to_eV, scene.max_width_eV)
        bent = scene.screening is None or scene.screening.converged
        reached = levels.complete and levels.accurate and bent
    if any(one.needs_curve for one in wanted):
        curve = sweep(SweepRequest(session), watch)
        reached = reached and curve.reached
    values = tuple(
        curve_value(one, curve) if one.needs_curve else _of_levels(one, levels) for one in wanted
    )
    return Answer(values, reached, levels, curve)


def level_value(level: Level, key: str) -> float:
    """Read one result off a level."""
    if key != BALANCE:
        return float(getattr(level, key))
    larger = max(level.left_width_eV, level.right_width_eV)
    return min(level.left_width_eV, level.right_width_eV) / larger if larger > 0.0 else math.nan


def _of_levels(wanted: Outcome, levels: LevelSet | None) -> float:
    if levels is None or wanted.number > len(levels.levels):
        return math.nan
    return level_value(levels.levels[wanted.number - 1], wanted.key)


def curve_value(wanted: Outcome, found: Sweep | None) -> float:
    """Read one result off a current curve; nan where it is not there."""
    value = None
    if found is not None and wanted.of == "device":
        value = None if found.figures is None else getattr(found.figures, wanted.key)
    elif found is not None and found.main is not None:
        main = found.main
        whole = main if wanted.of == "curve" else getattr(main, wanted.of)
        value = None if whole is None else getattr(whole, wanted.key)
    return math.nan if value is None else float(value)


def _refused(text: str, allowed: str, path: KeyPath) -> SessionError:
    return SessionError("result", f"is {printable(text)!r}", allowed, path=path)
