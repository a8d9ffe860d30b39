"""Where the energy axis is cut for an integral over T, so that each panel is smooth."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from physics.quadrature import EVEN, PEAK, ROOT, Panels

FloatArray = NDArray[np.float64]

AROUND_FERMI_KT = np.array([-20.0, -12.0, -6.0, -3.0, 0.0, 3.0, 6.0, 12.0, 20.0, 30.0, 45.0, 70.0])
"""Cuts around a Fermi energy: the logarithm's nearest poles lie at +- i pi kT."""
TOO_CLOSE_KT = 0.7
"""Cuts for the Fermi energies are left out closer than this to another."""
WIDEST_EV = 0.08
"""Widest panel: off a level, T changes by a few factors of e over it."""
LONGEST_S = 3.0
"""Longest panel in s through a level: its nearest poles lie at +- i pi / 2."""


def energy_panels(
    owner: int,
    range_eV: tuple[float, float],
    *,
    fermi_eV: FloatArray,
    kT_eV: float,
    level_eV: FloatArray,
    width_eV: FloatArray,
) -> Panels:
    """Cut one member's energies.

    Parameters
    ----------
    owner : int
        Number of the member.
    range_eV : tuple of float
        From the edge above which both contacts are open to where hardly an electron is.
    fermi_eV : ndarray
        Fermi energies that the integrand is not smooth around.
    level_eV, width_eV : ndarray, shape (R,)
        The levels, sorted; nan at the end is left out.
    """
    low_eV, high_eV = range_eV
    there = np.isfinite(level_eV)
    level, half_width = level_eV[there], 0.5 * width_eV[there]
    between = 0.5 * (level[1:] + level[:-1])
    fixed = [low_eV, *between.tolist(), high_eV]
    if level.size:
        fixed.append(0.5 * (low_eV + float(level[0])))  # the first panel, at the edge, has no level
    cuts = _cuts(fixed, fermi_eV, kT_eV)
    start, stop = cuts[:-1], cuts[1:]
    number = np.ceil((stop - start) / WIDEST_EV).astype(np.int64)
    group = np.searchsorted(between, 0.5 * (start + stop))
    if level.size == 0:
        kind, centre, scale = (np.full(start.size, x) for x in (EVEN, low_eV, 1.0))
        first, last = start - low_eV, stop - low_eV
    else:
        kind = np.full(start.size, PEAK)
        centre, scale = level[group], half_width[group]
        first, last = (np.arcsinh((end - centre) / scale) for end in (start, stop))
        number = np.maximum(number, np.ceil((last - first) / LONGEST_S).astype(np.int64))
    kind[0], centre[0], scale[0] = ROOT, low_eV, stop[0] - low_eV
    first[0], last[0] = 0.0, 1.0
    rank = np.arange(int(number.sum())) - np.repeat(np.cumsum(number) - number, number)
    which = np.repeat(np.arange(number.size), number)
    step = ((last - first) / number)[which]
    begin = first[which] + rank * step
    return Panels(
        owner=np.full(which.size, owner),
        group=group[which],
        kind=kind[which].astype(np.int64),
        centre=centre[which].astype(np.float64),
        scale=scale[which].astype(np.float64),
        start=begin,
        stop=begin + step,
    )


def _cuts(fixed_eV: list[float], fermi_eV: FloatArray, kT_eV: float) -> FloatArray:
    """Sorted energies at which panels end: the fixed ones, and some around the Fermi energies."""
    low, high = min(fixed_eV), max(fixed_eV)
    kept = list(fixed_eV)
    for cut in np.unique((fermi_eV[:, None] + AROUND_FERMI_KT * kT_eV).ravel()).tolist():
        if low < cut < high and min(abs(cut - other) for other in kept) > TOO_CLOSE_KT * kT_eV:
            kept.append(cut)
    return np.unique(kept)
