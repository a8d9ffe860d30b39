"""Levels of many profiles that are each a little different from one that is known.

A level of a draw is the one that the designed level has become, not the one of the same rank: it is
looked for where a linear prediction expects it. Where both contacts are open the draws are computed
side by side (`family`, `resonances`); a draw whose levels lie elsewhere, or do not tell themselves
apart, is computed by itself with a proof (`levels`), and where even that leaves a doubt it is
followed from the design in steps (`track`).
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.family import cut_family, family_of
from physics.field import Profile, valence_top, without_runways
from physics.levels import Level, LevelSet, find_levels
from physics.resonances import find_resonances

FloatArray = NDArray[np.float64]

MARGIN_EV = 0.02
"""Levels are looked for this far, and four widths, beyond where they are expected."""
ABOVE_EDGE_EV = 1e-3
"""A level nearer to a contact's edge than this is left to `levels`."""
OFF_EDGE_EV = 1e-6
SURE_SHARE = 0.35
"""A level is known again within this share of the distance between two expected ones."""
SURE_EV = 0.03
"""A level that stands alone is known again within this distance, or two of its widths."""
ALIKE_DECADES = 1.0
"""A level whose width is this many decades off is another one: one of a spacer, say."""
ALIKE_FROM_EV = 1e-9
"""Levels narrower than this are alike in any case."""
STEPS = (0.25, 0.5, 0.75, 1.0)


@dataclass(frozen=True, eq=False)
class Expected:
    """The levels of a design and which of them are wanted."""

    energy_eV: FloatArray
    """All levels of the design's window, sorted, shape (R,)."""
    width_eV: FloatArray
    """Their widths, shape (R,)."""
    wanted: tuple[int, ...]
    """Which are wanted, counted from 0."""
    max_width_eV: float
    """Broadest level of the design's window; one of a draw may be twice as broad."""

    @property
    def reach_eV(self) -> float:
        """How far beyond the wanted levels one has to look."""
        return MARGIN_EV + 4.0 * float(self.width_eV[list(self.wanted)].max())


def expected_of(design: LevelSet, wanted: Sequence[int]) -> Expected:
    """Expect the levels of a design."""
    energy = np.array([level.energy_eV for level in design.levels])
    width = np.array([level.width_eV for level in design.levels])
    return Expected(energy, width, tuple(wanted), design.max_width_eV)


def energies_and_widths(
    profiles: Sequence[Profile], place_eV: FloatArray, expected: Expected
) -> tuple[FloatArray, FloatArray]:
    """Find the wanted levels of many profiles side by side.

    Parameters
    ----------
    place_eV : ndarray, shape (B, R)
        Where each profile's levels are expected.

    Returns
    -------
    energy_eV, width_eV : ndarray, shape (B, W)
        nan where a level is not open on both sides, is not found, or could be another one.
    """
    energy, width = (np.full((len(profiles), len(expected.wanted)), np.nan) for _ in range(2))
    window = _windows(profiles, place_eV, expected)
    open_rows = np.isfinite(window).all(axis=0)
    cores = [without_runways(profile) for profile in profiles]
    pieces = np.array([core.thickness_nm.size for core in cores])
    for count in np.unique(pieces[open_rows]).tolist():
        rows = np.flatnonzero(open_rows & (pieces == count))
        family = family_of([cores[row] for row in rows.tolist()])
        low, high = window[:, rows]
        sectors = cut_family(family, low, high, depth_eV=expected.max_width_eV)
        found = find_resonances(family, sectors, low, high, expected.max_width_eV)
        for at, row in enumerate(rows.tolist()):
            there = found.is_level[at]
            energies, widths = found.energy_eV[at, there], found.width_eV[at, there]
            for n, match in enumerate(matched(energies, widths, place_eV[row], expected)):
                if match is not None:
                    energy[row, n], width[row, n] = energies[match], widths[match]
    return energy, width


def _windows(profiles: Sequence[Profile], place_eV: FloatArray, expected: Expected) -> FloatArray:
    """Low and high end of each profile's window, shape (2, B); nan where it is not open."""
    wanted = place_eV[:, list(expected.wanted)]
    edge = np.array([max(profile.contact_edge_eV) for profile in profiles])
    top = np.array([valence_top(profile)[0] for profile in profiles])
    floor = np.maximum(edge, top) + OFF_EDGE_EV
    low = np.maximum(wanted.min(axis=1) - expected.reach_eV, floor)
    high = wanted.max(axis=1) + expected.reach_eV
    is_open = wanted.min(axis=1) > floor + ABOVE_EDGE_EV
    result: FloatArray = np.where(is_open, np.stack([low, high]), np.nan)
    return result


def matched(
    energy_eV: FloatArray, width_eV: FloatArray, place_eV: FloatArray, expected: Expected
) -> list[int | None]:
    """Say which of the levels found (N,) each wanted one has become; None where in doubt."""
    taken: list[int | None] = []
    for number in expected.wanted:
        like = _alike(width_eV, expected.width_eV[number])
        if not like.any():
            taken.append(None)
            continue
        distance = np.where(like, np.abs(energy_eV - place_eV[number]), np.inf)
        at = int(np.argmin(distance))
        rivals = _alike(expected.width_eV, expected.width_eV[number])
        rivals[number] = False
        gap = np.abs(place_eV[rivals] - place_eV[number]).min(initial=np.inf)
        reach = min(SURE_SHARE * float(gap), max(SURE_EV, 2.0 * float(width_eV[at])))
        taken.append(at if distance[at] <= reach else None)
    return [at if at is None or taken.count(at) == 1 else None for at in taken]


def _alike(width_eV: FloatArray, of_eV: float) -> NDArray[np.bool_]:
    """Say which levels are not of quite another width than a given one."""
    ratio = np.maximum(width_eV, ALIKE_FROM_EV) / max(of_eV, ALIKE_FROM_EV)
    return np.asarray(np.abs(np.log10(ratio)) <= ALIKE_DECADES)


def proved(
    profile: Profile, place_eV: FloatArray, expected: Expected
) -> tuple[list[Level | None], bool]:
    """Find the wanted levels of one profile, on either side of the contacts' edges.

    Parameters
    ----------
    place_eV : ndarray, shape (R,)
        Where its levels are expected.

    Returns
    -------
    levels : list of Level or None, one for each wanted level
        None where it is not found or could be another one.
    reached : bool
        Whether count and widths are proved and accurate.

    Raises
    ------
    EnergyError, StructureError
        As `find_levels`.
    """
    wanted = place_eV[list(expected.wanted)]
    floor = max(profile.lowest_eV, valence_top(profile)[0]) + OFF_EDGE_EV
    low = max(float(wanted.min()) - expected.reach_eV, floor)
    high = max(float(wanted.max()) + expected.reach_eV, low + MARGIN_EV)
    found = find_levels(profile, low, high, 2.0 * expected.max_width_eV)
    energy = np.array([level.energy_eV for level in found.levels])
    width = np.array([level.width_eV for level in found.levels])
    taken = matched(energy, width, place_eV, expected)
    levels = [None if at is None else found.levels[at] for at in taken]
    return levels, found.complete and found.accurate


def track(
    profile_at: Callable[[float], Profile], place_eV: FloatArray, expected: Expected
) -> tuple[list[Level | None], bool]:
    """Follow the wanted levels from the design to a draw.

    Parameters
    ----------
    profile_at : callable
        Gives the profile a share of the way to the draw, from 0 to 1.
    place_eV : ndarray, shape (R,)
        Where the draw's levels are expected by the linear prediction.

    Returns
    -------
    levels, reached
        As `proved`; None where a level was lost on the way.

    Raises
    ------
    EnergyError, StructureError
        As `find_levels`.
    """
    off = np.zeros_like(place_eV)
    slope = place_eV - expected.energy_eV
    levels: list[Level | None] = []
    lost: set[int] = set()
    reached = True
    for share in STEPS:
        place = expected.energy_eV + share * slope + off
        levels, reached = proved(profile_at(share), place, expected)
        for number, level in zip(expected.wanted, levels, strict=True):
            if level is None:
                lost.add(number)
            else:
                off[number] += level.energy_eV - place[number]
    kept = zip(expected.wanted, levels, strict=True)
    return [None if number in lost else level for number, level in kept], reached
