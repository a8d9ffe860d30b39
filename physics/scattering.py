"""Transmission, reflection, phases and dwell time at real energies.

From the right contact inwards the ratio ``eta = f / psi`` of flux to wave is carried across each
sector by its real transfer matrix. Real and imaginary part are carried apart, because the
imaginary part is the flux per density and obeys ``|psi|^2 Im eta = constant`` exactly: it keeps its
relative accuracy through any barrier, which is what makes T + R = 1 hold to rounding at a
resonance and T = 1e-400 a number (through its logarithm). The ratio form is the invariant
embedding of Light and Walker, J. Chem. Phys. 65, 4272 (1976), here on the matrix of `sectors`.

The dwell time is the probability in the stack over the incident flux (F. T. Smith, Phys. Rev. 118,
349 (1960)), with the density's integral over a sector from the energy derivative of its matrix.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C_EV_NM2
from physics.constants import HBAR_EV_S
from physics.contacts import Contacts, contact_mass_at
from physics.field import Profile
from physics.sectors import Expanded, Sectors, cut, matrices, matrices_and_slopes

FloatArray = NDArray[np.float64]

ENERGIES_AT_ONCE = 65_536
"""Energies carried through the stack at once: millions would fill the memory, not go faster."""
NODE_GUARD = 1e-20
"""Relative shift that keeps a division by an exact node finite, far below rounding."""


@dataclass(frozen=True, eq=False)
class Scattering:
    """What gets through, at real energies; every array has shape (E,)."""

    energy_eV: FloatArray
    transmission: FloatArray
    """Flux transmitted over flux incident; 0 where either contact is closed."""
    log10_transmission: FloatArray
    """Its decadic logarithm, also where the number itself underflows; -inf for T = 0."""
    reflection: FloatArray
    """Flux reflected over flux incident; 1 where either contact is closed."""
    transmitted_phase_rad: FloatArray
    """Phase at the right face for unit incidence at the left face; nan where T is 0."""
    reflected_phase_rad: FloatArray
    """Phase of the reflected amplitude at the left face; nan where the left contact is closed."""
    dwell_time_s: FloatArray
    """Probability in the stack over incident flux; nan where the left contact is closed."""


@dataclass(frozen=True, eq=False)
class Carried:
    """The state that leaves to the right, carried to the left face; every array has shape (E,)."""

    ratio_real: FloatArray
    """Re(f / psi) at the left face, eV nm."""
    ratio_imag: FloatArray
    """Im(f / psi) at the left face, eV nm."""
    log_amplitude: FloatArray
    """Natural logarithm of |psi(left face) / psi(right face)|."""
    phase_rad: FloatArray
    """Phase of psi(left face) / psi(right face)."""
    content_nm: FloatArray
    """Integral of the density over the stack, over |psi(left face)|^2."""


def scatter(profile: Profile, energy_eV: FloatArray) -> Scattering:
    """Solve the scattering problem of a wave that comes in from the left.

    Parameters
    ----------
    profile : Profile
        Edges and masses over position.
    energy_eV : ndarray, shape (E,)
        Energies, on the profile's scale, in any order.

    Raises
    ------
    StructureError
        The stack is too thick for these energies.
    """
    parts = list(scatter_in_parts(profile, energy_eV))
    if len(parts) == 1:
        return parts[0]
    names = [field.name for field in fields(Scattering)]
    return Scattering(*(np.concatenate([getattr(p, name) for p in parts]) for name in names))


def scatter_in_parts(profile: Profile, energy_eV: FloatArray) -> Iterator[Scattering]:
    """As `scatter`, `ENERGIES_AT_ONCE` by `ENERGIES_AT_ONCE`; what is refused is so at once."""
    energy = np.atleast_1d(np.asarray(energy_eV, dtype=np.float64))
    sectors = cut(profile, float(energy.min()), float(energy.max()))
    return (
        scatter_through(profile, sectors, energy[first : first + ENERGIES_AT_ONCE])
        for first in range(0, energy.size, ENERGIES_AT_ONCE)
    )


def scatter_through(profile: Profile, sectors: Sectors, energy_eV: FloatArray) -> Scattering:
    """As `scatter`, with sectors that were cut before; energies lie inside their window."""
    q_left = contact_flux_eV_nm(profile, 0, energy_eV)
    q_right = contact_flux_eV_nm(profile, 1, energy_eV)
    carried = carry_left(profile, sectors, energy_eV)
    x, y = carried.ratio_real, carried.ratio_imag
    left_open, both_open = q_left > 0.0, (q_left > 0.0) & (q_right > 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        incident = (q_left + y) ** 2 + x**2
        log_t = np.log(4.0 * q_left * q_right / incident) - 2.0 * carried.log_amplitude
        reflection = np.where(both_open, ((q_left - y) ** 2 + x**2) / incident, 1.0)
        incident_phase = np.arctan2(-x, q_left + y)
        reflected = np.arctan2(x, q_left - y) - incident_phase
        velocity = 2.0 * q_left / HBAR_EV_S  # nm / s for unit incident density
        dwell = carried.content_nm * (4.0 * q_left**2 / incident) / velocity
    log_t = np.where(both_open, log_t, -np.inf)
    nan = np.float64(np.nan)
    return Scattering(
        energy_eV=energy_eV,
        transmission=np.exp(log_t),
        log10_transmission=log_t / math.log(10.0),
        reflection=reflection,
        transmitted_phase_rad=np.where(
            both_open, wrapped(-carried.phase_rad - incident_phase), nan
        ),
        reflected_phase_rad=np.where(left_open, wrapped(reflected), nan),
        dwell_time_s=np.where(left_open, dwell, nan),
    )


def log_transmission_through(
    profile: Contacts, sectors: Expanded, energy_eV: FloatArray
) -> FloatArray:
    """Natural logarithm of T alone, in the shape of the energies; -inf where a contact is closed.

    As `scatter_through`, at less than half its cost.
    """
    q_left = contact_flux_eV_nm(profile, 0, energy_eV)
    q_right = contact_flux_eV_nm(profile, 1, energy_eV)
    x, y = np.where(q_right < 0.0, q_right, 0.0), np.where(q_right > 0.0, q_right, 0.0)
    log_amplitude = np.zeros_like(energy_eV)
    for _, (a, b, c, d) in matrices(sectors, energy_eV):
        by = b * y
        w = d - b * x + NODE_GUARD * d
        size = w * w + by * by
        x, y = ((a * x - c) * w - a * by * y) / size, y / size
        log_amplitude += np.log(size)
    open_both = (q_left > 0.0) & (q_right > 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        log_t = np.log(4.0 * q_left * q_right / ((q_left + y) ** 2 + x * x)) - log_amplitude
    result: FloatArray = np.where(open_both, log_t, -np.inf)
    return result


def contact_flux_eV_nm(profile: Contacts, side: int, energy_eV: FloatArray) -> FloatArray:
    """``c k / m(E)`` in a contact where it is open; ``-c kappa / m(E)`` where it is closed.

    Parameters
    ----------
    side : int
        0 for the left contact, 1 for the right one.
    energy_eV : ndarray, shape (E,)
    """
    above = energy_eV - profile.contact_edge_eV[side]
    scale = C_EV_NM2 / contact_mass_at(profile, side, energy_eV)
    flux: FloatArray = np.sign(above) * np.sqrt(scale * np.abs(above))
    return flux


def carry_left(profile: Profile, sectors: Sectors, energy_eV: FloatArray) -> Carried:
    """Carry the outgoing (closed: decaying) state of the right contact to the left face."""
    q = contact_flux_eV_nm(profile, 1, energy_eV)
    x = np.where(q < 0.0, q, 0.0)
    y = np.where(q > 0.0, q, 0.0)
    log_amplitude = np.zeros_like(energy_eV)
    content = np.zeros_like(energy_eV)
    turn_real, turn_imag = np.ones_like(energy_eV), np.zeros_like(energy_eV)
    for _, matrix, slopes in matrices_and_slopes(sectors, energy_eV):
        a, b, c, d = matrix
        by = b * y
        w = d - b * x + NODE_GUARD * d  # psi(left) / psi(right) = w - i by
        size = w * w + by * by
        x, y = ((a * x - c) * w - a * by * y) / size, y / size
        log_amplitude += np.log(size)
        turn_real, turn_imag = turn_real * w + turn_imag * by, turn_imag * w - turn_real * by
        scale = 1.0 / np.sqrt(size)
        turn_real *= scale
        turn_imag *= scale
        content = content / size + sector_content_nm(matrix, slopes, x, y)
    return Carried(x, y, 0.5 * log_amplitude, np.arctan2(turn_imag, turn_real), content)


def sector_content_nm(
    matrix: FloatArray, slopes: FloatArray, x: FloatArray, y: FloatArray
) -> FloatArray:
    """Integral of the density over a sector for psi = 1, f = x + i y at its left face.

    From ``d/dx (u df/dE - f du/dE) = -u^2 - (b/c) f^2`` for real solutions u at real energy: the
    density is |psi|^2 and, where the mass goes with the energy, the valence component's
    ``(b/c) |f|^2``.
    """
    a, b, c, d = matrix
    da, db, dc, dd = slopes
    both = c * db - a * dd
    content: FloatArray = (c * da - a * dc) + 2.0 * both * x + (d * db - b * dd) * (x * x + y * y)
    return content


def wrapped(phase_rad: FloatArray) -> FloatArray:
    """Bring a phase into (-pi, pi]."""
    return -np.remainder(np.pi - phase_rad, 2.0 * np.pi) + np.pi
