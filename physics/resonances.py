"""The poles of a family of profiles, fast: what the current needs to know of the levels.

`levels` proves its answer complete, at a cost that a curve of a hundred biases cannot bear. Here
the closed stack's states, counted exactly (Sturm), start Aberth's iteration for all members at
once, without a contour. What could go wrong is that a narrow level's start ends at another pole.
A narrow level keeps its energy whatever the walls of the closed stack are; so each closed state
that no pole was found near is looked for again behind another wall, and where it is still there the
member is not `sure`: it should be asked from `levels`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.family import Family, FamilySectors
from physics.field import Profile
from physics.leaving import STOPS, leaving_states
from physics.levels import find_levels
from physics.outgoing import SECTION, Sheet, mismatch, states_below
from physics.sectors import cut
from physics.spectrum import APART_EV, NARROW_EV

ComplexArray = NDArray[np.complex128]
FloatArray = NDArray[np.float64]

OPEN = Sheet(left_open=True, right_open=True)
START_EV = 1e-5
"""Width of the brackets that start the iteration."""
START_GAP_EV = 1e-8
"""Starts in one bracket are set apart by this, lest they move as one."""
MOST_STEPS = 16
SETTLED_EV = 1e-13
"""Step below which a pole is settled; the step after it is far below rounding."""
LONGEST_STEP_EV = 0.05
NEAR_WIDTHS, NEAR_EV = 3.0, 2e-4
"""A closed state is accounted for by a pole within so many widths of it, or this distance."""
OTHER_WALL_EV_NM = 1e3
"""A wall all but impenetrable, against one that lets the wave stand free."""


@dataclass(frozen=True, eq=False)
class Resonances:
    """Levels of B members, sorted by energy; rows of shape (B, R) are filled up with nan."""

    energy_eV: FloatArray
    width_eV: FloatArray
    """Full width Gamma, from the flux where it is too narrow for the pole to tell."""
    line_peak: FloatArray
    """T at the peak of a line so narrow, and so far from others, that it is put in as a line
    (`spectrum`); nan of all others."""


def find_resonances(
    family: Family,
    sectors: FamilySectors,
    low_eV: FloatArray,
    high_eV: FloatArray,
    depth_eV: float,
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
    pole, sure = fast_poles(family, sectors, low_eV, high_eV, depth_eV)
    rows = [pole[n][np.isfinite(pole[n])] for n in range(pole.shape[0])]
    for n in np.flatnonzero(~sure):
        found = find_levels(family.members[n], float(low_eV[n]), float(high_eV[n]), 2.0 * depth_eV)
        rows[n] = np.array([complex(x.energy_eV, -0.5 * x.width_eV) for x in found.levels])
    return _described(family, rows)


def _described(family: Family, rows: list[ComplexArray]) -> Resonances:
    size = (len(rows), max(row.size for row in rows))
    energy, width, peak = (np.full(size, np.nan) for _ in range(3))
    for n, row in enumerate(rows):
        energy[n, : row.size], width[n, : row.size] = row.real, -2.0 * row.imag
        narrow = np.flatnonzero(width[n] < NARROW_EV)
        if narrow.size:
            width[n, narrow], peak[n, narrow] = _from_flux(family.members[n], row[narrow])
        gap = np.diff(row.real, prepend=-np.inf, append=np.inf)
        peak[n, : row.size][np.minimum(gap[1:], gap[:-1]) <= APART_EV] = np.nan
    return Resonances(energy, width, peak)


def _from_flux(profile: Profile, pole_eV: ComplexArray) -> tuple[FloatArray, FloatArray]:
    """Width and T at the peak of narrow levels, each of shape (N,)."""
    sectors = cut(profile, float(pole_eV.real.min()), float(pole_eV.real.max()), stops=STOPS)
    states = leaving_states(profile, sectors, OPEN, pole_eV)
    log_width = np.logaddexp(*states.log_width_eV)
    return np.exp(log_width), 4.0 * np.exp(states.log_width_eV.sum(axis=0) - 2.0 * log_width)


def fast_poles(
    family: Family,
    sectors: FamilySectors,
    low_eV: FloatArray,
    high_eV: FloatArray,
    depth_eV: float,
) -> tuple[ComplexArray, NDArray[np.bool_]]:
    """Find poles without a proof; see `find_resonances`.

    Returns
    -------
    pole_eV : ndarray, shape (B, R)
        Settled poles, sorted by energy, filled up with nan.
    sure : ndarray, shape (B,)
        Whether no narrow level can have been missed.
    """
    closed = _closed_energies(family, sectors, low_eV, high_eV)
    pole, settled = _polished(family, sectors, closed, depth_eV)
    sure = _all_accounted_for(family, sectors, closed, np.where(settled, pole, np.nan))
    sure = sure & ~_coincide(np.where(settled, pole, np.nan))
    settled &= (pole.real >= low_eV[:, None]) & (pole.real <= high_eV[:, None])
    pole = np.where(settled, pole, complex(np.nan, np.nan))
    order = np.argsort(pole.real, axis=1)  # nan last
    return np.take_along_axis(pole, order, axis=1), sure


def _closed_energies(
    family: Family, sectors: FamilySectors, low_eV: FloatArray, high_eV: FloatArray
) -> FloatArray:
    """Energies of the closed stacks' states in the windows, shape (B, R), filled up with nan."""
    ends = states_below(family, sectors, OPEN, np.stack([low_eV, high_eV], axis=1))
    number = ends[:, 1] - ends[:, 0]
    rank = ends[:, :1] + np.arange(int(number.max()))  # (B, R)
    lower = np.broadcast_to(low_eV[:, None], rank.shape)
    upper = np.broadcast_to(high_eV[:, None], rank.shape)
    share = np.linspace(0.0, 1.0, SECTION + 1)
    while rank.size and float((upper - lower).max()) > START_EV:
        trial = lower[..., None] + (upper - lower)[..., None] * share  # (B, R, T)
        inner = trial[..., 1:-1].reshape(rank.shape[0], -1)
        count = states_below(family, sectors, OPEN, inner).reshape(*rank.shape, -1)
        passed = (count <= rank[..., None]).sum(axis=-1)[..., None]
        lower = np.take_along_axis(trial, passed, axis=-1)[..., 0]
        upper = np.take_along_axis(trial, passed + 1, axis=-1)[..., 0]
    there = np.arange(rank.shape[1]) < number[:, None]
    return np.where(there, 0.5 * (lower + upper), np.nan)


def _polished(
    family: Family, sectors: FamilySectors, start_eV: FloatArray, depth_eV: float
) -> tuple[ComplexArray, NDArray[np.bool_]]:
    """Aberth's iteration (Math. Comp. 27, 339 (1973)) from given starts, all members at once."""
    there = np.isfinite(start_eV)
    apart = START_GAP_EV * np.arange(start_eV.shape[1])
    pole = np.where(there, start_eV + apart, sectors.centre_eV) + 0j
    low, high = (sectors.centre_eV + sign * sectors.reach_eV for sign in (-1.0, 1.0))
    moving, settled = there.copy(), np.zeros_like(there)
    for _ in range(MOST_STEPS):
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


def _all_accounted_for(
    family: Family, sectors: FamilySectors, closed_eV: FloatArray, pole_eV: ComplexArray
) -> NDArray[np.bool_]:
    """Say for each member whether every narrow closed state has a pole, shape (B,)."""
    distance = np.abs(closed_eV[:, :, None] - pole_eV.real[:, None, :])
    reach = np.maximum(-2.0 * NEAR_WIDTHS * pole_eV.imag, NEAR_EV)[:, None, :]
    bare = np.isfinite(closed_eV) & ~np.any(distance <= reach, axis=2)
    if not bare.any():
        return np.ones(bare.shape[0], dtype=bool)
    middle = np.where(bare, closed_eV, sectors.centre_eV)
    ends = np.concatenate([middle - NEAR_EV, middle + NEAR_EV], axis=1)
    count = states_below(family, sectors, OPEN, ends, OTHER_WALL_EV_NM)
    jump = count[:, middle.shape[1] :] - count[:, : middle.shape[1]]
    return np.asarray(~np.any(bare & (jump > 0), axis=1))
