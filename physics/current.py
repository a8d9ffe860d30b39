"""The current density of a stack at many biases, after Tsu and Esaki.

R. Tsu and L. Esaki, Appl. Phys. Lett. 22, 562 (1973)::

    J = e m kT / (2 pi^2 hbar^3) * integral T(E) ln[(1 + exp((mu_L - E)/kT))
                                                   / (1 + exp((mu_R - E)/kT))] dE

with the left contact's mass in the plane and both spins. The integral runs over panels cut at the
higher contact edge, around both Fermi energies and half-way between levels; through a level the
energy is E_r + (Gamma/2) sinh(s), so that no line is too narrow (`quadrature`). Panels are halved
until the error estimate is met. What is left out above the last panel is bounded by T <= 1.

Within `NEAR_EV` of a level narrower than `NARROW_EV`, where stepping in double precision cannot
resolve the line, T is its Breit-Wigner line with the partial widths of the flux, as in `spectrum`.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.constants import (
    BOLTZMANN_EV_PER_K,
    ELECTRON_MASS_KG,
    ELEMENTARY_CHARGE_C,
    HBAR_J_S,
)
from physics.dephasing import COHERENT, Dephasing
from physics.family import Family, cut_family
from physics.panels import energy_panels
from physics.probes import log_transmissions
from physics.quadrature import PEAK, Panels, estimate, joined
from physics.resonances import Resonances, find_resonances
from physics.scattering import log_transmission_through
from physics.spectrum import NEAR_EV
from physics.supply import supply_eV

FloatArray = NDArray[np.float64]
IndexArray = NDArray[np.int64]
Transmission = Callable[[IndexArray, FloatArray], FloatArray]
"""T of some members, named by their rows (R,), at energies of shape (R, E)."""

RELATIVE_ERROR = 1e-7
"""Relative error of the current up to which panels are halved."""
MOST_ROUNDS = 16
MOST_PANELS = 4000
"""Panels of one member at which halving is given up."""
DEPTH_EV = 0.06
"""Levels broader than twice this make no feature that plain panels would not resolve."""
FAR_KT, OVER_KT = 100.0, 32.0
"""Range above the Fermi energies in kT, and above the highest edge, where T is of order 1."""
ROUNDING = 1e-16
"""Relative rounding of an energy: by so much the distance from a level is off."""


@dataclass(frozen=True, eq=False)
class Currents:
    """Current densities of B members."""

    current_density_A_per_cm2: FloatArray
    """Positive when electrons flow from left to right, shape (B,)."""
    error_A_per_cm2: FloatArray
    """Bound on its numerical error, shape (B,)."""
    reached: NDArray[np.bool_]
    """Whether `RELATIVE_ERROR` was reached, shape (B,)."""
    levels: Resonances
    by_level_A_per_cm2: FloatArray
    """Current at energies nearer to a level than to any other, shape (B, R)."""


def tsu_esaki(
    family: Family,
    mu_left_eV: FloatArray,
    mu_right_eV: FloatArray,
    temperature_K: float,
    mass: float,
    *,
    dephasing: Dephasing = COHERENT,
) -> Currents:
    """Compute the currents of a family of profiles.

    Parameters
    ----------
    mu_left_eV, mu_right_eV : ndarray, shape (B,)
        Fermi energies of both contacts.
    temperature_K : float
        Temperature of the carriers.
    mass : float
        Mass in the plane, in m0.
    dephasing : Dephasing
        How coherence is lost; T then is that by all ways.
    """
    kT = BOLTZMANN_EV_PER_K * temperature_K
    low, high = _window(family, np.maximum(mu_left_eV, mu_right_eV), kT)
    sectors = cut_family(family, low, high, depth_eV=max(DEPTH_EV, 0.5 * dephasing.width_eV))
    top = np.minimum(high, [member.highest_eV + DEPTH_EV for member in family.members])
    levels = find_resonances(
        family, sectors, low, np.maximum(top, low + kT), DEPTH_EV, dephasing=dephasing
    )
    fermi = np.stack([mu_left_eV, mu_right_eV], axis=1)
    panels = joined(
        [
            energy_panels(
                n,
                (float(low[n]), float(high[n])),
                fermi_eV=fermi[n],
                kT_eV=kT,
                level_eV=levels.energy_eV[n],
                width_eV=levels.total_width_eV[n],
            )
            for n in range(low.size)
        ]
    )

    def transmission(rows: IndexArray, energy_eV: FloatArray) -> FloatArray:
        some = family.rows(rows), sectors.rows(rows)
        if dephasing.acts:
            lost = dephasing.width_eV, dephasing.well_of_layer
            return np.exp(log_transmissions(*some, energy_eV, *lost)[1])
        return np.exp(log_transmission_through(*some, energy_eV))

    def integrand(some: Panels) -> tuple[FloatArray, FloatArray]:
        distance, dx = some.nodes()
        energy = some.centre[:, None] + distance
        through = _with_lines(some, distance, levels, _by_rows(transmission, some.owner, energy))
        mu = fermi[some.owner]
        return estimate(through * supply_eV(energy, mu[:, :1], mu[:, 1:], kT), dx)

    done = _integrate(panels, integrand, low.size)
    tail = kT**2 * np.exp(-(high - fermi.max(axis=1)) / kT)
    return _currents(done, levels, tail * (mu_left_eV != mu_right_eV), current_scale(mass))


def current_scale(mass: float) -> float:
    """Return e m e^2 / (2 pi^2 hbar^3): A/cm^2 for an integral of T times `supply_eV` in eV^2."""
    joule = ELEMENTARY_CHARGE_C
    per_m2 = ELEMENTARY_CHARGE_C * mass * ELECTRON_MASS_KG / (2.0 * math.pi**2 * HBAR_J_S**3)
    return per_m2 * joule**2 * 1e-4


def _window(family: Family, mu_eV: FloatArray, kT: float) -> tuple[FloatArray, FloatArray]:
    """Energies that carry current: from the higher edge to where hardly an electron is."""
    low = np.maximum(*family.contact_edge_eV)[:, 0]
    highest = np.array([member.highest_eV for member in family.members])
    above = np.maximum(mu_eV, low)
    high = np.minimum(above + FAR_KT * kT, np.maximum(above, highest) + OVER_KT * kT)
    return low, high


def _by_rows(transmission: Transmission, owner: IndexArray, energy_eV: FloatArray) -> FloatArray:
    """Evaluate T at the nodes of panels, shape (N, 15), side by side for all owners."""
    order = np.argsort(owner, kind="stable")
    rows, first, number = np.unique(owner[order], return_index=True, return_counts=True)
    slot = np.arange(owner.size) - np.repeat(first, number)
    row = np.repeat(np.arange(rows.size), number)
    nodes = energy_eV.shape[1]
    grid = np.repeat(energy_eV[order][first][:, None, :], int(number.max()), axis=1)
    grid[row, slot] = energy_eV[order]
    through = transmission(rows, grid.reshape(rows.size, -1)).reshape(rows.size, -1, nodes)
    result = np.empty_like(energy_eV)
    result[order] = through[row, slot]
    return result


def _with_lines(
    panels: Panels, distance_eV: FloatArray, levels: Resonances, through: FloatArray
) -> FloatArray:
    """Put narrow levels' lines in, where the distance is known better than the energy."""
    if levels.line_peak.size == 0:
        return through
    peak = np.where(panels.kind == PEAK, levels.line_peak[panels.owner, panels.group], np.nan)
    near = np.isfinite(peak)[:, None] & (np.abs(distance_eV) <= NEAR_EV)
    line = peak[:, None] / (1.0 + (distance_eV / panels.scale[:, None]) ** 2)
    return np.where(near, line, through)


@dataclass(frozen=True, eq=False)
class _Done:
    panels: Panels
    integral: FloatArray
    error: FloatArray


def _integrate(
    panels: Panels, integrand: Callable[[Panels], tuple[FloatArray, FloatArray]], members: int
) -> _Done:
    """Halve panels until every member's error estimate is met, or the work is too much."""
    integral, error = integrand(panels)
    for _ in range(MOST_ROUNDS):
        size = np.bincount(panels.owner, np.abs(integral), members)
        off = np.bincount(panels.owner, error, members)
        number = np.bincount(panels.owner, minlength=members)
        late = (off > RELATIVE_ERROR * size) & (number < MOST_PANELS)
        allowed = RELATIVE_ERROR * size / np.maximum(number, 1)
        coarse = late[panels.owner] & (error > allowed[panels.owner])
        if not coarse.any():
            break
        halves = panels.pick(coarse).halved()
        more, more_error = integrand(halves)
        panels = joined([panels.pick(~coarse), halves])
        integral = np.concatenate([integral[~coarse], more])
        error = np.concatenate([error[~coarse], more_error])
    return _Done(panels, integral, error)


def _currents(done: _Done, levels: Resonances, tail: FloatArray, scale: float) -> Currents:
    members, ranks = levels.energy_eV.shape
    owner = done.panels.owner
    current = np.asarray(np.bincount(owner, done.integral, members), dtype=np.float64)
    by_level = np.zeros((members, ranks))
    if ranks:
        np.add.at(by_level, (owner, done.panels.group), done.integral)
    blurred = ROUNDING * np.abs(levels.energy_eV) / (0.5 * levels.total_width_eV)
    plain = np.isnan(levels.line_peak) & np.isfinite(levels.energy_eV)
    rounding = np.sum(np.where(plain, np.minimum(1.0, blurred), 0.0) * np.abs(by_level), axis=1)
    error: FloatArray = np.bincount(owner, done.error, members) + tail + rounding
    size: FloatArray = np.abs(current)
    reached = error <= 10.0 * RELATIVE_ERROR * size
    return Currents(scale * current, scale * error, reached, levels, scale * by_level)
