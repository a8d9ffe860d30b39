"""The outgoing-wave condition whose zeros are the levels.

A level is a complex energy at which a wave exists that only leaves: outgoing in an open contact,
decaying in a closed one (A. J. F. Siegert, Phys. Rev. 56, 750 (1939)). With the state of the right
contact carried to the left face by the matrices of `sectors`, that is the zero of::

    F(E) = f(0) + g_left(E) psi(0)

where ``g`` is the outward f / psi that a contact imposes. F has no pole and, on one
sheet, no branch cut: it is what the argument principle wants. The sheet is a matter of which
contacts are open, hence the same everywhere between two neighbouring contact edges.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C_EV_NM2
from physics.contacts import Contacts, contact_mass_at
from physics.errors import EnergyError
from physics.field import Profile
from physics.scattering import NODE_GUARD
from physics.sectors import Expanded, Sectors, matrices, matrices_and_slopes

ComplexArray = NDArray[np.complex128]
FloatArray = NDArray[np.float64]

SECTION, LEAST_SECTION = 32, 4
"""Parts that each bracket is cut into at once while it is narrowed; of many brackets, fewer."""
TRIED_AT_ONCE = 4096
"""Energies beyond which longer arrays go no faster, so that fewer parts cost less."""
LEVEL_WORK = 9_000_000
"""(Levels + `ROUNDS`) times (sectors + `DISTINCT_WEIGHT` times distinct ones) that are computed,
some 20 s of one core; beyond, a narrower window is asked for."""
ROUNDS = 150
"""Levels whose work is that of going through the stack again and again, for however few."""
DISTINCT_WEIGHT = 3
"""A sector unlike all others costs this many times more: its matrix is its own."""
RESCALE_EVERY = 8
"""Sectors between rescalings; a wave grows by at most exp(2 * 1.5 * 8) = 3e10 in between."""


@dataclass(frozen=True)
class Sheet:
    """Which contacts are open, for energies between two neighbouring contact edges."""

    left_open: bool
    right_open: bool

    @property
    def closed(self) -> bool:
        """Whether nothing can leave, so that every level is bound."""
        return not (self.left_open or self.right_open)


def outward_ratio_eV_nm(
    profile: Contacts, side: int, is_open: bool, energy_eV: ComplexArray
) -> ComplexArray:
    """Outward f / psi of the wave that leaves (open) or decays (closed) in a contact.

    Parameters
    ----------
    side : int
        0 for the left contact, 1 for the right one.
    energy_eV : ndarray, shape (E,)
        Complex energies on the sheet that ``is_open`` names.
    """
    above = energy_eV - profile.contact_edge_eV[side]
    scale = C_EV_NM2 / contact_mass_at(profile, side, energy_eV)
    ratio: ComplexArray = 1j * np.sqrt(scale * above) if is_open else -np.sqrt(-scale * above)
    return ratio


def mismatch(
    profile: Contacts, sectors: Expanded, sheet: Sheet, energy_eV: ComplexArray
) -> tuple[ComplexArray, ComplexArray]:
    """Evaluate F and dF/dE, both over one positive factor per energy, each of shape (E,)."""
    g = outward_ratio_eV_nm(profile, 1, sheet.right_open, energy_eV)
    psi, flux = np.ones_like(energy_eV), g
    psi_slope = np.zeros_like(energy_eV)
    flux_slope = _ratio_slope(profile, 1, g, energy_eV)
    for index, (a, b, c, d), (da, db, dc, dd) in matrices_and_slopes(sectors, energy_eV):
        psi_slope, flux_slope = (
            dd * psi - db * flux + d * psi_slope - b * flux_slope,
            da * flux - dc * psi + a * flux_slope - c * psi_slope,
        )
        psi, flux = d * psi - b * flux, a * flux - c * psi
        if index % RESCALE_EVERY == 0:
            scale = 1.0 / (np.abs(psi) + np.abs(flux))
            psi, flux = psi * scale, flux * scale
            psi_slope, flux_slope = psi_slope * scale, flux_slope * scale
    g = outward_ratio_eV_nm(profile, 0, sheet.left_open, energy_eV)
    g_slope = _ratio_slope(profile, 0, g, energy_eV)
    return flux + g * psi, flux_slope + g * psi_slope + g_slope * psi


def _ratio_slope(
    profile: Contacts, side: int, ratio: ComplexArray, energy_eV: ComplexArray
) -> ComplexArray:
    """Give the derivative per eV of `outward_ratio_eV_nm`; (E - V) / m(E) grows by m / m(E)^2."""
    share = profile.contact_mass[side] / contact_mass_at(profile, side, energy_eV)
    slope: ComplexArray = 0.5 * ratio * share / (energy_eV - profile.contact_edge_eV[side])
    return slope


def states_below(
    profile: Contacts,
    sectors: Expanded,
    sheet: Sheet,
    energy_eV: FloatArray,
    wall_eV_nm: float = 0.0,
) -> NDArray[np.int64]:
    """Count the eigenvalues of the closed stack below each real energy, in the energies' shape.

    Sturm's oscillation theorem: the nodes of the state that satisfies the right end's condition.
    A closed contact lets it decay; an open one is replaced by a wall that imposes the inward
    f = wall psi, so that on an open sheet these are starting points for the levels, not the levels.
    """
    ends = [
        _closed_ratio(profile, side, is_open, energy_eV, wall_eV_nm)
        for side, is_open in enumerate((sheet.left_open, sheet.right_open))
    ]
    x = -ends[1]
    count = np.zeros(energy_eV.shape, dtype=np.int64)
    for _, (a, b, c, d) in matrices(sectors, energy_eV):
        w = d - b * x + NODE_GUARD * d
        x = (a * x - c) / w
        count += w < 0.0
    return count + (x > ends[0])


def _closed_ratio(
    profile: Contacts, side: int, is_open: bool, energy_eV: FloatArray, wall_eV_nm: float
) -> FloatArray:
    """Inward f / psi of the decaying wave in a closed contact; the wall's for an open one."""
    if is_open:
        return np.full_like(energy_eV, wall_eV_nm)
    below = np.maximum(profile.contact_edge_eV[side] - energy_eV, 0.0)
    ratio: FloatArray = np.sqrt(C_EV_NM2 / contact_mass_at(profile, side, energy_eV) * below)
    return ratio


def closed_stack_energies(
    profile: Profile, sectors: Sectors, sheet: Sheet, window: tuple[float, float], width_eV: float
) -> FloatArray:
    """Eigenvalues of the closed stack between two energies, shape (N,), by counting nodes.

    The brackets of all eigenvalues are narrowed together, each cut into up to `SECTION` parts at
    once, until they are ``width_eV`` wide or as narrow as a double allows.

    Raises
    ------
    EnergyError
        There are too many for a reasonable time.
    """
    first, last = states_below(profile, sectors, sheet, np.array(window))
    _require_feasible(int(last - first), sectors)
    rank = np.arange(first, last)
    lower, upper = (np.full(rank.size, end) for end in window)
    parts = min(max(TRIED_AT_ONCE // max(rank.size, 1), LEAST_SECTION), SECTION)
    share = np.linspace(0.0, 1.0, parts + 1)[1:-1]
    while rank.size and np.any(upper - lower > np.maximum(width_eV, 2.0 * np.spacing(upper))):
        trial = lower[:, None] + (upper - lower)[:, None] * share
        # To begin with all brackets are the whole window, and their energies the same.
        tried, place = np.unique(trial, return_inverse=True)
        count = states_below(profile, sectors, sheet, tried)[place].reshape(trial.shape)
        passed = (count <= rank[:, None]).sum(axis=1)
        walls = np.concatenate([lower[:, None], trial, upper[:, None]], axis=1)
        row = np.arange(rank.size)
        narrowed = walls[row, passed + 1] - walls[row, passed] < upper - lower
        lower, upper = walls[row, passed], walls[row, passed + 1]
        if not narrowed.any():
            break
    middle: FloatArray = 0.5 * (lower + upper)
    return middle


def _require_feasible(levels: int, sectors: Sectors) -> None:
    """Refuse what would take too long, and say how much less would not."""
    weight = sectors.count + DISTINCT_WEIGHT * sectors.coefficients.shape[2]
    if (levels + ROUNDS) * weight <= LEVEL_WORK:
        return
    feasible = LEVEL_WORK // weight - ROUNDS
    if feasible <= 0:
        raise EnergyError(
            f"levels in a stack of {sectors.count} sectors take too long; "
            "describe fewer layers, or thinner ones"
        )
    raise EnergyError(
        f"about {levels} levels in a stack of {sectors.count} sectors take too long; "
        f"narrow the window to some {feasible} levels"
    )
