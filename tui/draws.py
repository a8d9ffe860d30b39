"""The results of a session as it might have been grown, draw by draw."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import partial

import numpy as np
from numpy.typing import NDArray

from physics.closed import OPEN
from physics.constants import HBAR_EV_S
from physics.drawn_levels import energies_and_widths, proved, track
from physics.errors import PhysicsError
from physics.field import Profile, go_on
from physics.growth_errors import drawn
from physics.levels import Level, levels_at
from physics.structure import Structure
from tui.chance import QUICK_KEYS, Plan, Slopes
from tui.outcome import curve_value, level_value
from tui.session.refusal import SessionError
from tui.study import field_over
from tui.sweep import sweep_over

FloatArray = NDArray[np.float64]

STEP = 0.1
"""Of the differences that make derivatives, in standard deviations."""


@dataclass(frozen=True, eq=False)
class Drawn:
    """What N draws came out as."""

    values: FloatArray
    """Of each result, shape (N, M); nan where there is none."""
    reached: NDArray[np.bool_]
    """Whether all was found and accurate, shape (N,)."""
    places_eV: FloatArray
    """Energies of the plan's levels, shape (N, R); nan where it was not looked for."""


def evaluate_draws(
    plan: Plan, draws: FloatArray, levels: Slopes | None, watch: Callable[[], None] = go_on
) -> Drawn:
    """Compute the results of draws (N, K), each of them in full.

    Parameters
    ----------
    levels : Slopes, optional
        Predicts the energies of the plan's levels; None: they are expected where designed.
    """
    count = draws.shape[0]
    values = np.full((count, len(plan.outcomes)), np.nan)
    reached = np.ones(count, dtype=bool)
    grown_as = [_structure(plan, draw) for draw in draws]
    reached &= [structure is not None for structure in grown_as]
    places = np.full((count, len(plan.numbers)), np.nan)
    if plan.expected is not None:
        there = plan.expected.energy_eV
        start = np.tile(there, (count, 1)) if levels is None else levels.at(draws)
        targets = (values, places, reached)
        _put_levels(plan, draws, grown_as, start, targets=targets, watch=watch)
    if plan.sweep is not None:
        for n, structure in enumerate(grown_as):
            if structure is not None:
                reached[n] &= _put_curve(plan, structure, values[n], watch)
    return Drawn(values, reached, places)


def _structure(plan: Plan, draw: FloatArray) -> Structure | None:
    """Give what a draw makes; None where it makes nothing that can be computed."""
    try:
        return drawn(plan.errors, draw.tolist())
    except (PhysicsError, SessionError):
        return None


def _put_curve(
    plan: Plan, structure: Structure, values: FloatArray, watch: Callable[[], None]
) -> bool:
    """Compute a draw's current; tell whether it is accurate."""
    if plan.sweep is None:
        return True
    try:
        found = sweep_over(structure, plan.sweep, watch)
    except PhysicsError:
        return False
    for n, one in enumerate(plan.outcomes):
        if one.needs_curve:
            values[n] = curve_value(one, found)
    return found.reached


Targets = tuple[FloatArray, FloatArray, NDArray[np.bool_]]
"""Values (N, M), places (N, R) and reached (N,), to be filled in."""


def _put_levels(
    plan: Plan,
    draws: FloatArray,
    grown_as: Sequence[Structure | None],
    place_eV: FloatArray,
    *,
    targets: Targets,
    watch: Callable[[], None],
) -> None:
    """Compute levels side by side, and one by one where that leaves a doubt."""
    expected = plan.expected
    if expected is None:
        return
    profiles, rows = [], []
    for row, structure in enumerate(grown_as):
        profile = None if structure is None else _profile(plan, structure, watch)
        if profile is None:
            targets[2][row] = False
            continue
        profiles.append(profile)
        rows.append(row)
    left = set(rows)
    if rows:
        energy, width = energies_and_widths(profiles, place_eV[rows], expected)
        for at in np.flatnonzero(np.isfinite(energy).all(axis=1)).tolist():
            left.discard(rows[at])
            row, poles = rows[at], (energy[at], width[at])
            _put_quick(plan, profiles[at], poles, targets[0][row], targets[1][row])
    for at, row in enumerate(rows):
        if row in left:
            _put_proved(
                plan, draws[row], profiles[at], place_eV[row], row, targets=targets, watch=watch
            )


def _profile(plan: Plan, structure: Structure, watch: Callable[[], None]) -> Profile | None:
    try:
        profile, report = field_over(plan.session.conditions, structure, watch)
    except PhysicsError:
        return None
    if report is not None and not report.converged:
        return None
    return replace(profile, watch=watch)


def _put_quick(
    plan: Plan,
    profile: Profile,
    poles: tuple[FloatArray, FloatArray],
    values: FloatArray,
    places: FloatArray,
) -> None:
    """Put in one draw's results, energies and widths (W,) of its levels being known."""
    expected = plan.expected
    if expected is None:
        return
    energy, width = poles
    places[list(expected.wanted)] = energy
    wanted = [(n, one) for n, one in enumerate(plan.outcomes) if one.of == "level"]
    levels: tuple[Level, ...] = ()
    if any(one.key not in QUICK_KEYS for _, one in wanted):
        levels = levels_at(profile, OPEN, energy - 0.5j * width)
    for n, one in wanted:
        at = expected.wanted.index(plan.numbers.index(one.number))
        values[n] = (
            level_value(levels[at], one.key)
            if levels
            else _quick(one.key, float(energy[at]), float(width[at]))
        )


def _quick(key: str, energy_eV: float, width_eV: float) -> float:
    """Read one of `QUICK_KEYS`."""
    match key:
        case "energy_eV":
            return energy_eV
        case "width_eV":
            return width_eV
        case "log10_width_eV":
            return math.log10(width_eV) if width_eV > 0.0 else -math.inf
        case _:
            return HBAR_EV_S / width_eV if width_eV > 0.0 else math.inf


def _put_proved(
    plan: Plan,
    draw: FloatArray,
    profile: Profile,
    place_eV: FloatArray,
    row: int,
    *,
    targets: Targets,
    watch: Callable[[], None],
) -> None:
    """Compute one draw's levels with a proof; follow them from the design if need be."""
    expected = plan.expected
    if expected is None:
        return
    values, places, reached = targets
    levels: list[Level | None] = [None]
    try:
        levels, sure = proved(profile, place_eV, expected)
        if None in levels:
            way = partial(_profile_at, plan, draw, watch)
            tracked, also = track(way, place_eV, expected)
            pairs = zip(levels, tracked, strict=True)
            levels, sure = [other if one is None else one for one, other in pairs], sure and also
    except PhysicsError:
        sure = False
    reached[row] &= sure and None not in levels
    found = dict(zip(expected.wanted, levels, strict=False))
    for at, level in found.items():
        places[row, at] = np.nan if level is None else level.energy_eV
    for n, one in enumerate(plan.outcomes):
        if one.of == "level":
            level = found.get(plan.numbers.index(one.number))
            values[row, n] = np.nan if level is None else level_value(level, one.key)


def _profile_at(plan: Plan, draw: FloatArray, watch: Callable[[], None], share: float) -> Profile:
    """Give the profile a share of the way to a draw."""
    structure = drawn(plan.errors, (share * draw).tolist())
    return replace(field_over(plan.session.conditions, structure, watch)[0], watch=watch)


def linear_model(plan: Plan, watch: Callable[[], None] = go_on) -> tuple[Slopes, Slopes | None]:
    """Find how results, and the energies of the plan's levels, go with each variable.

    Returns
    -------
    results : Slopes
        M results, the plan's.
    levels : Slopes or None
        Energies of the plan's levels, from which the draws' are predicted.
    """
    step = np.array([1.0 if v.source == "grading" else STEP for v in plan.errors.variables])
    design = np.zeros((1, step.size))
    steps = np.diag(step)
    if plan.expected is None:
        done = evaluate_draws(plan, np.concatenate([design, steps, -steps]), None, watch)
        return _slopes(plan, done.values, step), None
    every = replace(plan.expected, wanted=tuple(range(len(plan.numbers))))
    around = replace(plan, expected=every)
    done = evaluate_draws(around, np.concatenate([design, steps, -steps]), None, watch)
    levels = _slopes(plan, done.places_eV, step)
    known = Slopes(plan.expected.energy_eV, np.nan_to_num(levels.slope), np.nan_to_num(levels.bend))
    return _slopes(plan, done.values, step), known


def _slopes(plan: Plan, values: FloatArray, step: FloatArray) -> Slopes:
    """Make derivatives of values (1 + 2 K, M) at the design and a step to either side."""
    count = step.size
    up, down = values[1 : count + 1].T, values[count + 1 :].T  # (M, K)
    is_square = np.array([v.source == "grading" for v in plan.errors.variables])
    slope = np.where(is_square, 0.0, (up - down) / (2.0 * step))
    bend = np.where(is_square, up - values[0][:, None], 0.0)
    return Slopes(values[0], slope, bend)
