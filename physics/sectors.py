"""A profile cut into sectors, and their transfer matrices at any energy, real or complex.

In one sector edge and mass are linear, so that with the outward flux ``f = c psi'/m``,
``c = hbar^2 / 2 m0``, the one-band equation of D. J. BenDaniel and C. B. Duke, Phys. Rev. 152, 683
(1966), is a first-order pair with polynomial coefficients::

    psi' = (m(x) / c) f          f' = (V(x) - E) psi

Both unknowns are continuous across every interface. The Frobenius series of the two fundamental
solutions is summed over position once, keeping the energy as a polynomial variable: the transfer
matrix of a sector is an entire function of the energy, hence a polynomial of low degree to
rounding while (local wavevector) x (length) stays below `SECTOR_PHASE`. One matrix product then
gives the matrices of all sectors at all energies; there is no pole, no special case at a band
edge, and no difference between flat, tilted and graded layers.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C_EV_NM2
from physics.errors import StructureError
from physics.field import Profile

Energies = NDArray[np.float64] | NDArray[np.complex128]

SECTOR_PHASE = 1.5
"""Largest (wavevector x length) of a sector: the series loses less than one digit up to here."""
SERIES_TERMS = 24
"""1.5**24 / 24! = 3e-20: the first term left out lies below the rounding of the first one."""
DEGREE = SERIES_TERMS // 2
"""Two powers of position bring at most one power of energy."""
BLOCK_ELEMENTS = 250_000
"""Matrix elements held at once (2 MB): blocks that stay in the cache run fastest."""
BUILD_BLOCK = 2048
"""Sectors whose series are summed at once."""
MAX_SECTORS = 400_000
"""A stack that needs more is refused rather than left to run for hours."""

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Sectors:
    """Sectors of a profile with their transfer matrices as polynomials in the energy.

    A matrix ``((a, b), (c, d))`` carries ``(psi, f)`` from a sector's left face to its right face
    (or to an inner stop); its determinant is 1.
    """

    position_nm: FloatArray
    """Faces of the sectors, shape (S + 1,)."""
    piece_index: NDArray[np.int64]
    """Piece of the profile that each sector belongs to, shape (S,)."""
    centre_eV: float
    """Energy about which the polynomials are expanded."""
    reach_eV: float
    """Energy distance that the expansion variable is scaled by."""
    coefficients: FloatArray
    """Shape (P, 4, S, DEGREE + 1): stop, element (a, b, c, d), sector, power of the energy."""
    stops: FloatArray
    """Where in each sector the matrices end, as fractions of its length, shape (P,)."""
    watch: Callable[[], None]
    """`Profile.watch`, called once a block of sectors."""

    @property
    def count(self) -> int:
        """Number of sectors."""
        return self.piece_index.size

    @property
    def length_nm(self) -> FloatArray:
        """Length of each sector, shape (S,)."""
        return np.diff(self.position_nm)


def cut(
    profile: Profile,
    low_eV: float,
    high_eV: float,
    *,
    depth_eV: float = 0.0,
    marks_nm: FloatArray | None = None,
    stops: Sequence[float] = (1.0,),
) -> Sectors:
    """Cut a profile for energies in a window.

    Parameters
    ----------
    profile : Profile
        Edges and masses over position.
    low_eV, high_eV : float
        The window of the energy's real part.
    depth_eV : float
        Largest distance of a complex energy from the real axis.
    marks_nm : ndarray, optional
        Positions inside the stack at which a sector has to end.
    stops : sequence of float
        Fractions of a sector's length at which its matrices are wanted.

    Raises
    ------
    StructureError
        More than `MAX_SECTORS` sectors would be needed.
    """
    piece, left, right = _sector_shares(profile, low_eV, high_eV, depth_eV, marks_nm)
    start, end = profile.position_nm[piece], profile.position_nm[piece + 1]
    position = np.append(start * (1.0 - left) + end * left, profile.length_nm)
    centre = 0.5 * (low_eV + high_eV)
    reach = max(0.5 * (high_eV - low_eV) + depth_eV, 1e-3)
    edge_l = _mix(profile.edge_left_eV[piece], profile.edge_right_eV[piece], left)
    edge_r = _mix(profile.edge_left_eV[piece], profile.edge_right_eV[piece], right)
    mass_l = _mix(profile.mass_left[piece], profile.mass_right[piece], left)
    mass_r = _mix(profile.mass_left[piece], profile.mass_right[piece], right)
    length = (right - left) * (end - start)
    stop_array = np.asarray(stops, dtype=np.float64)
    shape = (stop_array.size, 4, piece.size, DEGREE + 1)
    coefficients = np.empty(shape)
    for first in range(0, piece.size, BUILD_BLOCK):
        part = slice(first, first + BUILD_BLOCK)
        coefficients[:, :, part] = _series(
            length=length[part],
            edge=edge_l[part] - centre,
            edge_rise=(edge_r - edge_l)[part],
            mass=mass_l[part],
            mass_rise=(mass_r - mass_l)[part],
            reach=reach,
            stops=stop_array,
        )
    return Sectors(position, piece, centre, reach, coefficients, stop_array, profile.watch)


def matrices(
    sectors: Sectors, energy_eV: Energies, *, forward: bool = False
) -> Iterator[tuple[int, NDArray[Any]]]:
    """Yield the transfer matrices sector by sector, by default from the last to the first.

    Parameters
    ----------
    sectors : Sectors
        As `cut` made them; the matrices are those to the last stop, the right face.
    energy_eV : ndarray, shape (E,)
        Real or complex energies inside the window the sectors were cut for.
    forward : bool
        Go from the first sector to the last.

    Yields
    ------
    index : int
        The sector, counted from 0.
    matrix : ndarray, shape (4, E)
        Elements a, b, c, d.
    """
    powers, _ = energy_powers(sectors, energy_eV)
    for start, block in _blocks(sectors, energy_eV.size, forward=forward):
        values = block @ powers  # (4, B, E)
        order = range(values.shape[1])
        for index in order if forward else reversed(order):
            yield start + index, values[:, index]


def matrices_and_slopes(
    sectors: Sectors, energy_eV: Energies
) -> Iterator[tuple[int, NDArray[Any], NDArray[Any]]]:
    """As `matrices`, from the last sector to the first, with the derivatives per eV as well."""
    powers, slopes = energy_powers(sectors, energy_eV)
    for start, block in _blocks(sectors, energy_eV.size, forward=False):
        values, derivatives = block @ powers, block @ slopes
        for index in reversed(range(values.shape[1])):
            yield start + index, values[:, index], derivatives[:, index]


def _blocks(sectors: Sectors, energies: int, *, forward: bool) -> Iterator[tuple[int, FloatArray]]:
    """Yield runs of sectors, few enough to stay in the cache, with their first index."""
    table = sectors.coefficients[-1]  # (4, S, D)
    size = max(1, BLOCK_ELEMENTS // (4 * max(1, energies)))
    starts = range(0, sectors.count, size)
    for start in starts if forward else reversed(starts):
        sectors.watch()
        yield start, np.ascontiguousarray(table[:, start : start + size])


def energy_powers(sectors: Sectors, energy_eV: Energies) -> tuple[NDArray[Any], NDArray[Any]]:
    """Powers of the scaled energy and their derivatives per eV, each of shape (DEGREE + 1, E)."""
    scaled = (energy_eV - sectors.centre_eV) / sectors.reach_eV
    powers = np.empty((DEGREE + 1, energy_eV.size), dtype=scaled.dtype)
    powers[0] = 1.0
    for n in range(1, DEGREE + 1):
        np.multiply(powers[n - 1], scaled, out=powers[n])
    slope = np.zeros_like(powers)
    slope[1:] = powers[:-1] * (np.arange(1, DEGREE + 1) / sectors.reach_eV)[:, None]
    return powers, slope


def _sector_shares(
    profile: Profile,
    low_eV: float,
    high_eV: float,
    depth_eV: float,
    marks_nm: FloatArray | None,
) -> tuple[NDArray[np.int64], FloatArray, FloatArray]:
    """Piece of each sector, and where in the piece (as a fraction) it begins and ends."""
    number = _sectors_per_piece(profile, low_eV, high_eV, depth_eV)
    if int(number.sum()) > MAX_SECTORS:
        allowed = f"it needs more than {MAX_SECTORS} sectors at these energies; make it thinner"
        raise StructureError("stack", "thickness_nm", profile.length_nm, allowed)
    piece = np.repeat(np.arange(number.size), number)
    rank = np.arange(piece.size) - np.repeat(np.cumsum(number) - number, number)
    left = rank / number[piece]
    if marks_nm is not None:
        piece, left = _with_marks(profile, piece, left, marks_nm)
    last = np.append(piece[1:] != piece[:-1], True)
    right = np.where(last, 1.0, np.append(left[1:], 1.0))
    return piece, left, right


def _sectors_per_piece(
    profile: Profile, low_eV: float, high_eV: float, depth_eV: float
) -> NDArray[np.int64]:
    ends = np.stack([profile.edge_left_eV, profile.edge_right_eV])
    distance = np.maximum(np.abs(ends - low_eV), np.abs(ends - high_eV)).max(axis=0)
    mass = np.maximum(profile.mass_left, profile.mass_right)
    wavevector = np.sqrt(mass * np.hypot(distance, depth_eV) / C_EV_NM2)
    length = np.diff(profile.position_nm)
    number: NDArray[np.int64] = np.ceil(wavevector * length / SECTOR_PHASE).astype(np.int64)
    return np.maximum(number, 1)


def _with_marks(
    profile: Profile, piece: NDArray[np.int64], left: FloatArray, marks_nm: FloatArray
) -> tuple[NDArray[np.int64], FloatArray]:
    """Add cuts at given positions, unless a cut is there already to within rounding."""
    faces = profile.position_nm
    inside = np.unique(marks_nm[(marks_nm > 0.0) & (marks_nm < faces[-1])])
    home = np.searchsorted(faces, inside, side="right") - 1
    share = (inside - faces[home]) / (faces[home + 1] - faces[home])
    pieces = np.concatenate([piece, home])
    shares = np.concatenate([left, share])
    order = np.lexsort((shares, pieces))
    pieces, shares = pieces[order], shares[order]
    fresh = np.append(True, (pieces[1:] != pieces[:-1]) | (np.diff(shares) > 1e-12))
    return pieces[fresh], shares[fresh]


def _series(
    *,
    length: FloatArray,
    edge: FloatArray,
    edge_rise: FloatArray,
    mass: FloatArray,
    mass_rise: FloatArray,
    reach: float,
    stops: FloatArray,
) -> FloatArray:
    """Sum the Frobenius series; shape (P, 4, S, DEGREE + 1).

    With s the fraction of the sector and e the scaled energy, order k + 1 of psi and f follows
    from orders k and k - 1::

        (k+1) psi[k+1] = (h/c) (m0 f[k] + m1 f[k-1])
        (k+1) f[k+1]   = h ((V0 - reach e) psi[k] + V1 psi[k-1])
    """
    h = length[:, None]
    v0, v1 = h * edge[:, None], h * edge_rise[:, None]
    m0, m1 = h * mass[:, None] / C_EV_NM2, h * mass_rise[:, None] / C_EV_NM2
    size = (2, length.size, DEGREE + 1)  # the two fundamental solutions
    psi, flux = np.zeros(size), np.zeros(size)
    psi[0, :, 0], flux[1, :, 0] = 1.0, 1.0
    psi_before, flux_before = np.zeros(size), np.zeros(size)
    orders = np.empty((SERIES_TERMS + 1, 4, length.size, DEGREE + 1))
    orders[0, :2], orders[0, 2:] = psi, flux
    for k in range(SERIES_TERMS):
        psi_next = (m0 * flux + m1 * flux_before) / (k + 1)
        flux_next = v0 * psi + v1 * psi_before
        flux_next[..., 1:] -= reach * h * psi[..., :-1]
        flux_next /= k + 1
        psi_before, flux_before, psi, flux = psi, flux, psi_next, flux_next
        orders[k + 1, :2], orders[k + 1, 2:] = psi, flux
    powers = stops[:, None] ** np.arange(SERIES_TERMS + 1)
    total: FloatArray = np.tensordot(powers, orders, axes=(1, 0))
    return total


def _mix(at_left: FloatArray, at_right: FloatArray, share: FloatArray) -> FloatArray:
    return at_left * (1.0 - share) + at_right * share
