"""The adaptive energy grid: every level of the window resolved in few points, however narrow.

A grid is laid through each level as E_r + (Gamma / 2) tan(theta) and on in decades, then halved
wherever log10 T departs from a straight line. A level narrower than `NARROW_EV` cannot be met by
stepping in double precision: within `NEAR_EV` of it T is its Breit-Wigner line (G. Breit and E.
Wigner, Phys. Rev. 49, 519 (1936)) with the partial widths of `levels`, where the distance from the
pole is known exactly and rounding of the energy does no harm.

Lost coherence changes T and R, and broadens the lines (`dephasing`); phases and dwell time stay
those of the coherent wave.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from physics.constants import HBAR_EV_S
from physics.dephasing import COHERENT, Dephasing
from physics.errors import EnergyError
from physics.field import Profile
from physics.levels import Level, LevelSet
from physics.probes import log_transmissions
from physics.scattering import Scattering, scatter_through
from physics.sectors import Sectors, cut

FloatArray = NDArray[np.float64]

BASE_POINTS = 161
"""Evenly spaced energies to begin with."""
LINE_POINTS = 13
"""Energies through one level's line, evenly spaced in theta."""
DECADE_POINTS = 2
"""Energies a decade of distance from a level, on each side."""
STRAIGHT = 0.02
"""Departure of log10 T from a straight line, in decades, up to which a step is left alone."""
HALVINGS = 4
MAX_POINTS = 20_000
NARROW_EV = 1e-8
"""Width below which T near the level is taken from its line."""
NEAR_EV = 1e-9
"""Distance within which it is: the line is off by distance / level spacing, plain T by
rounding / distance, and both are about 1e-7 here."""
APART_EV = 1e-6
"""Two levels closer than this share no isolated line; plain T is used and says what it can."""


def adaptive_spectrum(
    profile: Profile,
    from_eV: float,
    to_eV: float,
    levels: LevelSet,
    dephasing: Dephasing = COHERENT,
) -> Scattering:
    """Compute the spectrum on a grid that resolves the levels.

    Parameters
    ----------
    profile : Profile
        Edges and masses over position.
    from_eV, to_eV : float
        The window, both ends included.
    levels : LevelSet
        The levels of this profile in the window.
    dephasing : Dephasing
        How coherence is lost.

    Raises
    ------
    EnergyError
        The window is empty.
    """
    if not from_eV < to_eV:
        raise EnergyError(f"the window from {from_eV:g} to {to_eV:g} eV is empty")
    sectors = cut(profile, from_eV, to_eV, depth_eV=0.5 * dephasing.width_eV)
    energy = first_grid(profile, from_eV, to_eV, levels, dephasing)
    result = spectrum_at(profile, sectors, energy, levels, dephasing)
    fresh = np.ones(energy.size - 1, dtype=bool)
    for _ in range(HALVINGS):
        bent = fresh & _bent(result)
        middle = 0.5 * (result.energy_eV[:-1] + result.energy_eV[1:])[bent]
        if middle.size == 0 or result.energy_eV.size + middle.size > MAX_POINTS:
            break
        more = spectrum_at(profile, sectors, middle, levels, dephasing)
        result, fresh = _merge(result, more)
    return result


def spectrum_at(
    profile: Profile,
    sectors: Sectors,
    energy_eV: FloatArray,
    levels: LevelSet,
    dephasing: Dephasing = COHERENT,
) -> Scattering:
    """Scattering at given energies, lines of narrow levels put in where stepping can't reach."""
    result = scatter_through(profile, sectors, energy_eV)
    narrow = [
        (level, near)
        for level in isolated_narrow(levels)
        if (near := np.abs(energy_eV - level.energy_eV) <= NEAR_EV).any()
    ]
    for level, near in narrow:
        result = _with_line(result, near, level)
    if not dephasing.acts:
        return result
    width, wells = dephasing.width_eV, dephasing.well_of_layer
    log_t = log_transmissions(profile, sectors, energy_eV, width, wells)[1]
    for level, near in narrow:
        gained = dephasing.of_level_eV(level.share_by_layer)
        if level.width_eV + gained < NARROW_EV:
            log_t[near] = _log_line(energy_eV[near], level, gained)
    return replace(result, **_through(log_t))


def isolated_narrow(levels: LevelSet) -> list[Level]:
    """Levels too narrow to be met by stepping and far enough from their neighbours."""
    energies = np.array([level.energy_eV for level in levels.levels])
    gaps = np.diff(energies, prepend=-np.inf, append=np.inf)
    return [
        level
        for n, level in enumerate(levels.levels)
        if level.kind == "quasi-bound"
        and level.width_eV < NARROW_EV
        and min(gaps[n], gaps[n + 1]) > APART_EV
    ]


def first_grid(
    profile: Profile,
    from_eV: float,
    to_eV: float,
    levels: LevelSet,
    dephasing: Dephasing = COHERENT,
) -> FloatArray:
    """Energies to begin with, sorted and distinct, both ends included."""
    parts = [np.linspace(from_eV, to_eV, BASE_POINTS)]
    spacing = (to_eV - from_eV) / (BASE_POINTS - 1)
    threshold = spacing * np.array([0.0, 1e-6, 1e-4, 1e-2, 0.1])
    parts += [edge + threshold for edge in profile.contact_edge_eV]
    for level in levels.levels:
        gained = dephasing.of_level_eV(level.share_by_layer)
        widths = {level.width_eV, level.width_eV + gained} if level.kind != "bound" else set()
        parts += [_line_grid(level.energy_eV, width, spacing) for width in widths]
    energy = np.unique(np.concatenate(parts))
    return energy[(energy >= from_eV) & (energy <= to_eV)]


def _line_grid(energy_eV: float, width_eV: float, spacing_eV: float) -> FloatArray:
    theta = np.linspace(-0.5, 0.5, LINE_POINTS + 2)[1:-1] * math.pi
    offset = 0.5 * width_eV * np.tan(theta)
    start = max(4.0 * width_eV, 4.0 * float(np.spacing(abs(energy_eV))))
    decades = math.log10(spacing_eV / start) if start < spacing_eV else 0.0
    number = math.ceil(DECADE_POINTS * decades)
    wings = start * 10.0 ** (np.arange(number) / DECADE_POINTS)
    grid: FloatArray = energy_eV + np.concatenate([[0.0], offset, wings, -wings])
    return grid


def _bent(result: Scattering) -> NDArray[np.bool_]:
    """Mark the steps at either of whose ends log10 T departs from its neighbours' chord."""
    energy, log_t = result.energy_eV, np.maximum(result.log10_transmission, -1e6)
    share = (energy[1:-1] - energy[:-2]) / (energy[2:] - energy[:-2])
    chord = log_t[:-2] * (1.0 - share) + log_t[2:] * share
    # A chord over two steps departs four times as far as one over a single step.
    departs = np.abs(log_t[1:-1] - chord) > 4.0 * STRAIGHT
    bent = np.zeros(energy.size - 1, dtype=bool)
    bent[:-1] |= departs
    bent[1:] |= departs
    return bent & (np.diff(energy) > 8.0 * np.spacing(np.abs(energy[1:])))


def _merge(first: Scattering, second: Scattering) -> tuple[Scattering, NDArray[np.bool_]]:
    """Merge two results by energy; also say which steps of the merged grid touch a new point."""
    order = np.argsort(np.concatenate([first.energy_eV, second.energy_eV]), kind="stable")
    is_new = order >= first.energy_eV.size
    merged = {
        name: np.concatenate([value, getattr(second, name)])[order]
        for name, value in vars(first).items()
    }
    return Scattering(**merged), is_new[:-1] | is_new[1:]


def _with_line(result: Scattering, near: NDArray[np.bool_], level: Level) -> Scattering:
    """Put a level's Breit-Wigner line in; phases, which need the background, are left unsaid."""
    log_t = _log_line(result.energy_eV[near], level)
    columns = {name: value.copy() for name, value in vars(result).items()}
    for name, value in _through(log_t).items():
        columns[name][near] = value
    columns["transmitted_phase_rad"][near] = np.nan
    columns["reflected_phase_rad"][near] = np.nan
    if level.width_eV > 0.0:
        peak_dwell = 4.0 * HBAR_EV_S * (level.left_width_eV / level.width_eV) / level.width_eV
        line = np.exp(_log_shape(result.energy_eV[near] - level.energy_eV, _log_width(level)))
        columns["dwell_time_s"][near] = peak_dwell * line
    return replace(result, **columns)


def _log_line(energy_eV: FloatArray, level: Level, gained_eV: float = 0.0) -> FloatArray:
    """Natural logarithm of T in a level's line, by lost coherence this much wider than its own.

    The line's area is kept: the peak falls as the width grows (see `dephasing`).
    """
    if level.peak_transmission == 0.0:
        return np.full_like(energy_eV, -np.inf)
    own = _log_width(level)
    total = float(np.logaddexp(own, math.log(gained_eV))) if gained_eV > 0.0 else own
    shape = _log_shape(energy_eV - level.energy_eV, total)
    return shape + (math.log(level.peak_transmission) + own - total)


def _log_shape(distance_eV: FloatArray, log_width: float) -> FloatArray:
    """Logarithm of a Lorentzian that is 1 at its peak."""
    with np.errstate(divide="ignore"):
        log_ratio = 2.0 * (np.log(np.abs(distance_eV)) - math.log(0.5) - log_width)
    return -np.logaddexp(0.0, log_ratio)


def _log_width(level: Level) -> float:
    return level.log10_width_eV * math.log(10.0)


def _through(log_t: FloatArray) -> dict[str, FloatArray]:
    """Give the columns of a `Scattering` that follow from the logarithm of T."""
    through = np.exp(log_t)
    return {
        "transmission": through,
        "log10_transmission": log_t / math.log(10.0),
        "reflection": 1.0 - through,
    }
