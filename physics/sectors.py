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
from physics.frobenius import DEGREE, sector_series

Energies = NDArray[np.float64] | NDArray[np.complex128]

SECTOR_PHASE = 1.5
"""Largest (wavevector x length) of a sector: the series loses less than one digit up to here."""
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
    kind: NDArray[np.int64]
    """Which of the distinct sectors each one is like, shape (S,): a superlattice has few."""
    coefficients: FloatArray
    """Shape (P, 4, U, DEGREE + 1): stop, element (a, b, c, d), distinct sector, power of energy."""
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
    piece, left, share = _sector_shares(profile, low_eV, high_eV, depth_eV, marks_nm)
    start, end = profile.position_nm[piece], profile.position_nm[piece + 1]
    position = np.append(start + (end - start) * left, profile.end_nm)
    centre = 0.5 * (low_eV + high_eV)
    reach = max(0.5 * (high_eV - low_eV) + depth_eV, 1e-3)
    edge_rise = (profile.edge_right_eV - profile.edge_left_eV)[piece]
    mass_rise = (profile.mass_right - profile.mass_left)[piece]
    described = np.stack(
        [
            share * profile.thickness_nm[piece],
            profile.edge_left_eV[piece] + edge_rise * left - centre,
            edge_rise * share,
            profile.mass_left[piece] + mass_rise * left,
            mass_rise * share,
        ],
        axis=1,
    )
    distinct, kind = np.unique(described, axis=0, return_inverse=True)
    stop_array = np.asarray(stops, dtype=np.float64)
    coefficients = np.empty((stop_array.size, 4, distinct.shape[0], DEGREE + 1))
    for first in range(0, distinct.shape[0], BUILD_BLOCK):
        part = slice(first, first + BUILD_BLOCK)
        coefficients[:, :, part] = sector_series(*distinct[part].T, reach=reach, stops=stop_array)
    return Sectors(
        position, piece, centre, reach, kind.ravel(), coefficients, stop_array, profile.watch
    )


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
    for index, (matrix,) in _each(sectors, (powers,), forward=forward):
        yield index, matrix


def matrices_and_slopes(
    sectors: Sectors, energy_eV: Energies
) -> Iterator[tuple[int, NDArray[Any], NDArray[Any]]]:
    """As `matrices`, from the last sector to the first, with the derivatives per eV as well."""
    for index, (matrix, slope) in _each(sectors, energy_powers(sectors, energy_eV), forward=False):
        yield index, matrix, slope


def all_matrices(sectors: Sectors, energy_eV: Energies, stops: slice = slice(None)) -> NDArray[Any]:
    """Give the matrices to the chosen stops of all sectors at once, shape (P, 4, S, E)."""
    powers, _ = energy_powers(sectors, energy_eV)
    return _product(sectors.coefficients[stops], powers)[:, :, sectors.kind]


def _each(
    sectors: Sectors, powers: tuple[NDArray[Any], ...], *, forward: bool
) -> Iterator[tuple[int, list[NDArray[Any]]]]:
    """Yield each sector with its products, (4, E) for every set of powers.

    Distinct sectors are multiplied out once where they are few; else in runs of sectors, short
    enough to stay in the cache.
    """
    table = sectors.coefficients[-1]  # (4, U, D)
    energies = max(1, powers[0].shape[1])
    size = max(1, BLOCK_ELEMENTS // (4 * energies))
    few = table.shape[1] <= min(size, sectors.count // 2)
    whole = [_product(table, power) for power in powers] if few else []
    starts = range(0, sectors.count, size)
    for start in starts if forward else reversed(starts):
        sectors.watch()
        kinds = sectors.kind[start : start + size]
        values = whole if few else [_product(table[:, kinds], power) for power in powers]
        order = range(kinds.size)
        for index in order if forward else reversed(order):
            at = kinds[index] if few else index
            yield start + index, [value[:, at] for value in values]


def _product(table: FloatArray, powers: NDArray[Any]) -> NDArray[Any]:
    """Multiply coefficients (..., D) with powers (D, E): one real product, also if E is complex."""
    flat = np.ascontiguousarray(table).reshape(-1, table.shape[-1])
    product = (flat @ powers.view(np.float64)).view(powers.dtype)
    return product.reshape(*table.shape[:-1], powers.shape[1])


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
    """Piece of each sector, where in the piece it begins and how much of it it is, as shares."""
    number = _sectors_per_piece(profile, low_eV, high_eV, depth_eV)
    if int(number.sum()) > MAX_SECTORS:
        allowed = f"it needs more than {MAX_SECTORS} sectors at these energies; make it thinner"
        raise StructureError("stack", "thickness_nm", profile.length_nm, allowed)
    piece = np.repeat(np.arange(number.size), number)
    rank = np.arange(piece.size) - np.repeat(np.cumsum(number) - number, number)
    left, share = rank / number[piece], 1.0 / number[piece]
    if marks_nm is None:
        return piece, left, share
    piece, left = _with_marks(profile, piece, left, marks_nm)
    last = np.append(piece[1:] != piece[:-1], True)
    return piece, left, np.where(last, 1.0, np.append(left[1:], 1.0)) - left


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
    inside = np.unique(marks_nm[(marks_nm > faces[0]) & (marks_nm < faces[-1])])
    home = np.searchsorted(faces, inside, side="right") - 1
    share = (inside - faces[home]) / (faces[home + 1] - faces[home])
    pieces = np.concatenate([piece, home])
    shares = np.concatenate([left, share])
    order = np.lexsort((shares, pieces))
    pieces, shares = pieces[order], shares[order]
    fresh = np.append(True, (pieces[1:] != pieces[:-1]) | (np.diff(shares) > 1e-12))
    return pieces[fresh], shares[fresh]
