"""The poles of a family of profiles, fast: what the current needs to know of the levels.

`levels` proves its answer complete, at a cost that a curve of a hundred biases cannot bear. Here
the closed stack's states, counted exactly (Sturm), start Aberth's iteration for all members at
once, without a contour. What could go wrong is that a narrow level's start ends at another pole.
A narrow level keeps its energy whatever the walls of the closed stack are; so each closed state
that no pole was found near is looked for again behind another wall. Where it is still there to
within `NEAR_EV`, a mark is set for the quadrature to look closely; where it is to within
`NARROW_FROM_EV`, closer than any quadrature looks, the member is asked from `levels`, which proves
its answer.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.closed import OPEN, between_walls, closed_family_energies, still_there
from physics.dephasing import COHERENT, Dephasing
from physics.family import Family, FamilySectors
from physics.field import Profile
from physics.leaving import STOPS, leaving_states
from physics.levels import find_levels
from physics.outgoing import mismatch
from physics.sectors import cut
from physics.spectrum import APART_EV, NARROW_EV
from physics.windows import lowest_allowed_eV

ComplexArray = NDArray[np.complex128]
FloatArray = NDArray[np.float64]

START_EV = 1e-6
"""Width of the brackets that start the iteration."""
START_GAP_EV = 1e-8
"""Starts in one bracket are set apart by this, lest they move as one."""
MOST_STEPS = 12
PATIENT_START_EV, PATIENT_STEPS = 1e-10, 60
"""The same for a member that is tried again by itself."""
SETTLED_EV = 1e-13
"""Step below which a pole is settled; the step after it is far below rounding."""
LONGEST_STEP_EV = 0.05
NEAR_WIDTHS, NEAR_EV = 3.0, 2e-4
"""A closed state is accounted for by a pole within so many widths of it, or this distance."""
NARROW_FROM_EV = 4e-6
"""Distance within which a state behind either wall is a narrow level that was missed."""


@dataclass(frozen=True, eq=False)
class Resonances:
    """Levels of B members, sorted by energy; rows of shape (B, R) are filled up with nan."""

    energy_eV: FloatArray
    width_eV: FloatArray
    """Full elastic width Gamma, from the flux where it is too narrow for the pole to tell."""
    total_width_eV: FloatArray
    """The same with what lost coherence adds, all of the state taken to be in wells."""
    is_level: NDArray[np.bool_]
    """False for marks, and for what rows are filled up with."""
    line_peak: FloatArray
    """T at the peak of a line so narrow, and so far from others, that it is put in as a line
    (`spectrum`); nan of all others."""


def find_resonances(
    family: Family,
    sectors: FamilySectors,
    low_eV: FloatArray,
    high_eV: FloatArray,
    depth_eV: float,
    *,
    dephasing: Dephasing = COHERENT,
) -> Resonances:
    """Find the levels in a window of each member, above both of its contacts' edges.

    Parameters
    ----------
    sectors : FamilySectors
        Cut for the windows and the depth.
    low_eV, high_eV : ndarray, shape (B,)
        The windows.
    depth_eV : float
        Poles deeper below the axis than this are let go; they make no feature of the spectrum.
    """
    fast = fast_poles(family, sectors, low_eV, high_eV, depth_eV)
    rows = []
    for n, sure in enumerate(fast.sure.tolist()):
        if sure:
            rows.append(_row(fast.pole_eV[n], fast.mark_eV[n]))
            continue
        one = slice(n, n + 1)
        alone = family.rows(np.array([n])), sectors.rows(np.array([n])), low_eV[one], high_eV[one]
        again = fast_poles(*alone, depth_eV, is_patient=True)
        if again.sure.all():
            rows.append(_row(again.pole_eV[0], again.mark_eV[0]))
            continue
        found = find_levels(family.members[n], float(low_eV[n]), float(high_eV[n]), 2.0 * depth_eV)
        poles = [complex(level.energy_eV, -0.5 * level.width_eV) for level in found.levels]
        rows.append(_row(np.array(poles, dtype=np.complex128), np.empty(0)))
    return _described(family, rows, dephasing)


def _row(pole_eV: ComplexArray, mark_eV: FloatArray) -> tuple[ComplexArray, NDArray[np.bool_]]:
    """Sort poles and marks, which are given the width that they stand for; nan is left out."""
    poles, marks = pole_eV[np.isfinite(pole_eV)], mark_eV[np.isfinite(mark_eV)]
    both = np.append(poles, marks - 1j * NEAR_EV)
    order = np.argsort(both.real)
    return both[order], order < poles.size


def _described(
    family: Family, rows: list[tuple[ComplexArray, NDArray[np.bool_]]], dephasing: Dephasing
) -> Resonances:
    size = (len(rows), max(pole.size for pole, _ in rows))
    energy, width, peak = (np.full(size, np.nan) for _ in range(3))
    is_level = np.zeros(size, dtype=bool)
    lost = dephasing.width_eV if dephasing.acts else 0.0
    for n, (pole, real) in enumerate(rows):
        energy[n, : pole.size], width[n, : pole.size] = pole.real, -2.0 * pole.imag
        is_level[n, : pole.size] = real
    total = width + lost
    for n, (pole, _) in enumerate(rows):
        narrow = np.flatnonzero(width[n] < NARROW_EV)
        if narrow.size:
            found = _from_flux(family.members[n], pole[narrow], dephasing)
            width[n, narrow], total[n, narrow], peak[n, narrow] = found
        gap = np.diff(pole.real, prepend=-np.inf, append=np.inf)
        crowded = np.minimum(gap[1:], gap[:-1]) <= APART_EV
        peak[n, : pole.size][crowded] = np.nan
    peak[total >= NARROW_EV] = np.nan
    return Resonances(energy, width, total, is_level, peak)


def _from_flux(
    profile: Profile, pole_eV: ComplexArray, dephasing: Dephasing
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Elastic and total width of narrow levels and T at their peak, each of shape (N,)."""
    sectors = cut(profile, float(pole_eV.real.min()), float(pole_eV.real.max()), stops=STOPS)
    states = leaving_states(profile, sectors, OPEN, pole_eV)
    log_width = np.logaddexp(*states.log_width_eV)
    width, total = np.exp(log_width), np.exp(log_width)
    if dephasing.acts:
        well = np.append(dephasing.well_of_layer, -1)[profile.layer_index[sectors.piece_index]]
        total = width + dephasing.width_eV * states.content[well >= 0].sum(axis=0)
    with np.errstate(divide="ignore"):
        log_peak = states.log_width_eV.sum(axis=0) - log_width - np.log(total)
    return width, total, 4.0 * np.exp(log_peak)


@dataclass(frozen=True, eq=False)
class FastPoles:
    """Poles without a proof; rows are filled up with nan."""

    pole_eV: ComplexArray
    """Settled poles, shape (B, R)."""
    mark_eV: FloatArray
    """Energies that ask for a close look, shape (B, R)."""
    sure: NDArray[np.bool_]
    """Whether no narrow level can have been missed, shape (B,)."""


def fast_poles(
    family: Family,
    sectors: FamilySectors,
    low_eV: FloatArray,
    high_eV: FloatArray,
    depth_eV: float,
    *,
    is_patient: bool = False,
) -> FastPoles:
    """Find poles without a proof; see `find_resonances`."""
    start, steps = (PATIENT_START_EV, PATIENT_STEPS) if is_patient else (START_EV, MOST_STEPS)
    core = sectors.some(between_walls(family, sectors, low_eV))
    if core.count == 0:
        nothing = np.full((low_eV.size, 0), np.nan)
        return FastPoles(nothing + 0j, nothing, np.ones(low_eV.size, dtype=bool))
    # Below the window too: behind a wall a broad level lies lower than its pole.
    allowed = [lowest_allowed_eV(member) for member in family.members]
    below = np.maximum(low_eV - depth_eV, np.minimum(low_eV, allowed))
    closed = closed_family_energies(family, core, below, high_eV, start)
    pole, settled = _polished(family, sectors, closed, depth_eV, steps)
    pole = np.where(settled, pole, complex(np.nan, np.nan))
    bare = _unaccounted_for(closed, pole)
    marked = still_there(family, core, np.where(bare, closed, np.nan), NEAR_EV)
    missed = still_there(family, core, np.where(marked, closed, np.nan), NARROW_FROM_EV)
    inside = (pole.real >= low_eV[:, None]) & (pole.real <= high_eV[:, None])
    marked &= (closed >= low_eV[:, None]) & (closed <= high_eV[:, None])
    return FastPoles(
        np.where(inside, pole, complex(np.nan, np.nan)),
        np.where(marked, closed, np.nan),
        ~missed.any(axis=1) & ~_coincide(pole),
    )


def _polished(
    family: Family,
    sectors: FamilySectors,
    start_eV: FloatArray,
    depth_eV: float,
    most_steps: int,
) -> tuple[ComplexArray, NDArray[np.bool_]]:
    """Aberth's iteration (Math. Comp. 27, 339 (1973)) from given starts, all members at once."""
    there = np.isfinite(start_eV)
    apart = START_GAP_EV * np.arange(start_eV.shape[1])
    pole = np.where(there, start_eV + apart, sectors.centre_eV) + 0j
    low, high = (sectors.centre_eV + sign * sectors.reach_eV for sign in (-1.0, 1.0))
    moving, settled = there.copy(), np.zeros_like(there)
    for _ in range(most_steps):
        rows = np.flatnonzero(moving.any(axis=1))
        if rows.size == 0:
            break
        value, slope = mismatch(family.rows(rows), sectors.rows(rows), OPEN, pole[rows])
        step = np.zeros_like(pole)
        step[rows] = _aberth_step(pole[rows], value / slope, there[rows])
        size = np.abs(step)
        step *= np.minimum(1.0, LONGEST_STEP_EV / np.maximum(size, SETTLED_EV))
        pole = np.where(moving, pole - step, pole)
        settled |= moving & (size < SETTLED_EV)
        lost = (np.abs(pole.imag) > depth_eV) | (pole.real < low) | (pole.real > high)
        moving &= ~settled & ~lost
    return pole, settled


def _aberth_step(
    pole: ComplexArray, newton: ComplexArray, there: NDArray[np.bool_]
) -> ComplexArray:
    apart = pole[:, :, None] - pole[:, None, :]
    pair = there[:, :, None] & there[:, None, :] & ~np.eye(pole.shape[1], dtype=bool)
    apart = np.where(pair & (apart != 0.0), apart, np.inf)
    step: ComplexArray = newton / (1.0 - newton * np.sum(1.0 / apart, axis=2))
    return step


def _coincide(pole_eV: ComplexArray) -> NDArray[np.bool_]:
    """Say for each member whether two starts have ended at one pole, shape (B,)."""
    gap = np.abs(pole_eV[:, :, None] - pole_eV[:, None, :])
    same = (gap <= 10.0 * SETTLED_EV) & ~np.eye(pole_eV.shape[1], dtype=bool)
    return np.asarray(same.any(axis=(1, 2)))


def _unaccounted_for(closed_eV: FloatArray, pole_eV: ComplexArray) -> NDArray[np.bool_]:
    """Say which closed states have no pole near them, shape (B, R)."""
    distance = np.abs(closed_eV[:, :, None] - pole_eV.real[:, None, :])
    reach = np.maximum(-2.0 * NEAR_WIDTHS * pole_eV.imag, NEAR_EV)[:, None, :]
    return np.asarray(np.isfinite(closed_eV) & ~np.any(distance <= reach, axis=2))
