"""States that only leave: the wave of a level, carried from both contacts to where it is large.

From each contact the leaving (closed: decaying) solution is carried inwards, the direction in
which it grows and is therefore computed to full relative accuracy however opaque the barrier. The
two are joined at the face where their product is largest, which is the well that the level lives
in. The flux at each face over the norm is the partial width (G. Gamow, Z. Phys. 51, 204 (1928);
the identity ``Gamma N = flux out`` holds exactly for a Siegert state), so that widths keep their
relative accuracy far below the rounding of the energy. Where the mass goes with the energy the
density is ``|psi|^2 + (b/c) |f|^2``, with the valence component of the two-band wave: what the
imaginary part of the energy multiplies in ``d/dx Im(psi* f)``, so that the identity stays exact.

States are computed for many levels at once; arrays end in the level axis N.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C_EV_NM2
from physics.contacts import contact_mass_at
from physics.field import Profile
from physics.outgoing import Sheet, outward_ratio_eV_nm
from physics.sectors import Sectors, all_matrices

ComplexArray = NDArray[np.complex128]
FloatArray = NDArray[np.float64]

GAUSS_POINTS = 8
"""Exact to 1e-12 for |psi|^2 over a sector of phase 1.5."""
NODE_SHARE, NODE_WEIGHT = np.polynomial.legendre.leggauss(GAUSS_POINTS)
STOPS = (*(float(share) for share in 0.5 * (1.0 + NODE_SHARE)), 1.0)
WEIGHTS = 0.5 * NODE_WEIGHT


@dataclass(frozen=True, eq=False)
class Leaving:
    """The waves of N levels on the faces and inside the sectors, and what leaves."""

    energy_eV: ComplexArray
    """The levels' complex energies, shape (N,)."""
    sheet: Sheet
    psi: ComplexArray
    """Wave at the sectors' faces, normalised to one electron, shape (S + 1, N)."""
    flux: ComplexArray
    """Its f = c psi'/m there, shape (S + 1, N)."""
    content: FloatArray
    """Probability in each sector, shape (S, N)."""
    log_width_eV: FloatArray
    """Natural logarithm of the partial width to the left and right contact, shape (2, N)."""


@dataclass(frozen=True, eq=False)
class Carriage:
    """One solution on all faces: psi and f, over exp(log_scale); each of shape (S + 1, N)."""

    psi: ComplexArray
    flux: ComplexArray
    log_scale: FloatArray

    def log_size(self, flux_scale_eV_nm: float) -> FloatArray:
        """Logarithm of the solution's size, blind to where its nodes fall."""
        return np.log(np.hypot(np.abs(self.psi), np.abs(self.flux) / flux_scale_eV_nm)) + (
            self.log_scale
        )


def leaving_states(
    profile: Profile, sectors: Sectors, sheet: Sheet, energy_eV: ComplexArray
) -> Leaving:
    """Compute the states of given levels.

    Parameters
    ----------
    sectors : Sectors
        Cut with stops that begin with `STOPS` and end with 1.
    sheet : Sheet
        Which contacts are open.
    energy_eV : ndarray, shape (N,)
        Complex energies of the levels.
    """
    inner = all_matrices(sectors, energy_eV, slice(GAUSS_POINTS))  # (G, 4, S, N)
    whole = all_matrices(sectors, energy_eV, slice(-1, None))[0]  # (4, S, N)
    ratio = [
        outward_ratio_eV_nm(profile, side, is_open, energy_eV)
        for side, is_open in enumerate((sheet.left_open, sheet.right_open))
    ]
    from_left = _carry(whole, -ratio[0])
    from_right = _carry_left(whole, ratio[1])
    joined, log_scale = _join(from_left, from_right, flux_scale(profile, sectors))
    inside = density(sectors, inner, joined[0], joined[1], sectors.stops[:GAUSS_POINTS])
    mean = np.tensordot(WEIGHTS, inside, axes=(0, 0))
    with np.errstate(under="ignore"):
        content = mean * np.exp(2.0 * log_scale[:-1]) * sectors.length_nm[:, None]
        size = np.abs(joined[0]) * np.exp(log_scale)
        norm = content.sum(axis=0) + _tails(profile, sheet, ratio, energy_eV, size)
        factor = np.exp(log_scale) / np.sqrt(norm)
        psi, flux = joined[0] * factor, joined[1] * factor
    widths = _log_widths(sheet, ratio, joined[0], log_scale, norm)
    return Leaving(energy_eV, sheet, psi, flux, content / norm, widths)


def density(
    sectors: Sectors,
    matrix: NDArray[Any],
    psi: ComplexArray,
    flux: ComplexArray,
    stops: FloatArray,
) -> FloatArray:
    """Density of waves at stops inside the sectors, the valence component included.

    Parameters
    ----------
    matrix : ndarray, shape (P, 4, S, N)
        Matrices to the stops.
    psi, flux : ndarray, shape (S + 1, N)
        The waves at the sectors' faces.
    stops : ndarray, shape (P,)
        The stops, as fractions of a sector.

    Returns
    -------
    ndarray, shape (P, S, N)
    """
    inside = matrix[:, 0] * psi[:-1] + matrix[:, 1] * flux[:-1]
    result: FloatArray = np.abs(inside) ** 2
    if sectors.mass_slope.any():
        first, last = sectors.mass_slope
        slope = first + (last - first) * stops[:, None]
        inside = matrix[:, 2] * psi[:-1] + matrix[:, 3] * flux[:-1]
        result += (slope / C_EV_NM2)[..., None] * np.abs(inside) ** 2
    return result


def flux_scale(profile: Profile, sectors: Sectors) -> float:
    """Return a typical f / psi of the stack, to weigh flux against wave."""
    mass = float(np.mean(profile.mass_left))
    return float(np.sqrt(C_EV_NM2 * sectors.reach_eV / mass))


def carry_from(
    sectors: Sectors, energy_eV: ComplexArray, ratio: ComplexArray, *, from_right: bool
) -> tuple[ComplexArray, ComplexArray, FloatArray]:
    """Carry a solution with given f / psi (N,) at one end to every face.

    Returns
    -------
    psi, flux, log_scale : ndarray, shape (S + 1, N)
        The solution is psi and f times exp(log_scale).
    """
    whole = all_matrices(sectors, energy_eV, slice(-1, None))[0]
    carriage = _carry_left(whole, ratio) if from_right else _carry(whole, ratio)
    return carriage.psi, carriage.flux, carriage.log_scale


def _carry_left(matrix: ComplexArray, ratio: ComplexArray) -> Carriage:
    """Carry the right contact's solution leftwards; ``matrix`` has shape (4, S, N)."""
    a, b, c, d = matrix
    back = _carry(np.stack([d, -b, -c, a])[:, ::-1], ratio)
    return Carriage(back.psi[::-1], back.flux[::-1], back.log_scale[::-1])


def _carry(matrix: ComplexArray, ratio: ComplexArray) -> Carriage:
    """Carry psi = 1, f = ratio through sectors, from the first to the last."""
    a, b, c, d = matrix
    shape = (a.shape[0] + 1, ratio.size)
    psis, fluxes = np.empty(shape, dtype=np.complex128), np.empty(shape, dtype=np.complex128)
    logs = np.zeros(shape)
    psi, flux, log_scale = np.ones_like(ratio), ratio, np.zeros(ratio.size)
    psis[0], fluxes[0] = psi, flux
    for s in range(a.shape[0]):
        psi, flux = a[s] * psi + b[s] * flux, c[s] * psi + d[s] * flux
        scale = np.abs(psi) + np.abs(flux)
        psi, flux, log_scale = psi / scale, flux / scale, log_scale + np.log(scale)
        psis[s + 1], fluxes[s + 1], logs[s + 1] = psi, flux, log_scale
    return Carriage(psis, fluxes, logs)


def _join(
    left: Carriage, right: Carriage, flux_scale_eV_nm: float
) -> tuple[tuple[ComplexArray, ComplexArray], FloatArray]:
    """Join the two solutions where their product is largest; psi, f and their log scale."""
    sizes = left.log_size(flux_scale_eV_nm) + right.log_size(flux_scale_eV_nm)
    at = np.argmax(sizes, axis=0)
    level = np.arange(at.size)
    weight = 1.0 / flux_scale_eV_nm**2
    overlap = (
        left.psi[at, level].conj() * right.psi[at, level]
        + weight * left.flux[at, level].conj() * right.flux[at, level]
    )
    size = np.abs(left.psi[at, level]) ** 2 + weight * np.abs(left.flux[at, level]) ** 2
    factor = overlap / size
    is_left = np.arange(left.psi.shape[0])[:, None] < at
    psi = np.where(is_left, left.psi * factor, right.psi)
    flux = np.where(is_left, left.flux * factor, right.flux)
    log_scale = np.where(
        is_left,
        left.log_scale - left.log_scale[at, level],
        right.log_scale - right.log_scale[at, level],
    )
    # Referred to the phase at the joint, where the wave of a narrow level is real.
    turn = np.exp(-1j * np.angle(right.psi[at, level] + 1e-300))
    return (psi * turn, flux * turn), log_scale


def _tails(
    profile: Profile,
    sheet: Sheet,
    ratio: list[ComplexArray],
    energy_eV: ComplexArray,
    size: FloatArray,
) -> FloatArray:
    """Probability in the closed contacts, for the wave's size at the faces; shape (N,)."""
    total = np.zeros(size.shape[1])
    for side, is_open in enumerate((sheet.left_open, sheet.right_open)):
        if not is_open:
            mass = contact_mass_at(profile, side, energy_eV)
            decay = -(ratio[side] * mass).real / C_EV_NM2
            valence = profile.contact_mass_slope[side] / C_EV_NM2 * np.abs(ratio[side]) ** 2
            total = total + size[-side] ** 2 * (1.0 + valence) / (2.0 * decay)
    return total


def _log_widths(
    sheet: Sheet,
    ratio: list[ComplexArray],
    psi: ComplexArray,
    log_scale: FloatArray,
    norm: FloatArray,
) -> FloatArray:
    """Logarithm of the partial widths, -inf to a closed contact; shape (2, N)."""
    widths = np.full((2, norm.size), -np.inf)
    for side, is_open in enumerate((sheet.left_open, sheet.right_open)):
        if is_open:
            flux = 2.0 * ratio[side].imag * np.abs(psi[-side]) ** 2
            widths[side] = np.log(flux) + 2.0 * log_scale[-side] - np.log(norm)
    return widths
