"""A profile cut into sectors, and their transfer matrices at any energy, real or complex.

In one sector edge, mass and mass slope are linear, so that with the outward flux ``f = c psi'/m``,
``c = hbar^2 / 2 m0``, the one-band equation of D. J. BenDaniel and C. B. Duke, Phys. Rev. 152, 683
(1966), is a first-order pair with polynomial coefficients::

    psi' = (m / c) f          f' = (V(x) - E) psi          m = m(x) + b(x) (E - V(x))

Both unknowns are continuous across every interface. The Frobenius series of the two fundamental
solutions is summed over position once, keeping the energy as a polynomial variable: the transfer
matrix of a sector is an entire function of the energy, hence a polynomial of low degree to
rounding while (local wavevector) x (length) stays below `SECTOR_PHASE`. One matrix product then
gives the matrices of all sectors at all energies; there is no pole, no special case at a band
edge, and no difference between flat, tilted and graded layers. A mass that goes with the energy
(b > 0, `physics.band`) is linear in it and changes nothing but the polynomial's degree.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from physics.cuts import described_sectors, sector_shares
from physics.field import Profile, require_above_valence
from physics.frobenius import DEGREE, TWO_BAND_DEGREE, sector_series

Energies = NDArray[np.float64] | NDArray[np.complex128]

BLOCK_ELEMENTS = 250_000
"""Matrix elements held at once (2 MB): blocks that stay in the cache run fastest."""
BUILD_BLOCK = 256
"""Sectors whose series are summed at once: what stays in the cache."""

FloatArray = NDArray[np.float64]


class Expanded(Protocol):
    """Transfer matrices as polynomials in the energy, of one profile or of a family of them."""

    @property
    def piece_index(self) -> NDArray[np.int64]:
        """Piece that each sector belongs to, shape (S,)."""

    @property
    def count(self) -> int:
        """Number of sectors."""

    def some(self, chosen: NDArray[np.bool_]) -> Expanded:
        """Give some of the sectors."""

    @property
    def coefficients(self) -> FloatArray:
        """Coefficients of the polynomials; the last axis counts the powers."""

    @property
    def centre_eV(self) -> float | FloatArray:
        """Energy about which the polynomials are expanded."""

    @property
    def reach_eV(self) -> float | FloatArray:
        """Energy distance that the expansion variable is scaled by."""

    def each(
        self, powers: tuple[NDArray[Any], ...], *, forward: bool
    ) -> Iterator[tuple[int, list[NDArray[Any]]]]:
        """Yield each sector's index with its elements (4, ...) for every set of powers."""


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
    """Shape (P, 4, U, D): stop, element (a, b, c, d), distinct sector, power of energy."""
    stops: FloatArray
    """Where in each sector the matrices end, as fractions of its length, shape (P,)."""
    watch: Callable[[], None]
    """`Profile.watch`, called once a block of sectors."""
    mass_slope: FloatArray
    """Mass slope at each sector's left and right face, in m0 per eV, shape (2, S)."""

    @property
    def count(self) -> int:
        """Number of sectors."""
        return self.piece_index.size

    @property
    def length_nm(self) -> FloatArray:
        """Length of each sector, shape (S,)."""
        return np.diff(self.position_nm)

    def some(self, chosen: NDArray[np.bool_]) -> Sectors:
        """Give the matrices of some of the sectors; positions stay those of all."""
        return replace(self, piece_index=self.piece_index[chosen], kind=self.kind[chosen])

    def each(
        self, powers: tuple[NDArray[Any], ...], *, forward: bool
    ) -> Iterator[tuple[int, list[NDArray[Any]]]]:
        """Yield each sector with its products, (4, E) for every set of powers.

        Distinct sectors are multiplied out once where they are few; else in runs of sectors, short
        enough to stay in the cache.
        """
        table = self.coefficients[-1]  # (4, U, D)
        energies = max(1, powers[0].shape[1])
        size = max(1, BLOCK_ELEMENTS // (4 * energies))
        few = table.shape[1] <= min(size, self.count // 2)
        whole = [_product(table, power) for power in powers] if few else []
        starts = range(0, self.count, size)
        for start in starts if forward else reversed(starts):
            self.watch()
            kinds = self.kind[start : start + size]
            values = whole if few else [_product(table[:, kinds], power) for power in powers]
            order = range(kinds.size)
            for index in order if forward else reversed(order):
                at = kinds[index] if few else index
                yield start + index, [value[:, at] for value in values]


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
    EnergyError
        The window reaches into a valence band, where a mass is not above 0.
    """
    require_above_valence(profile, low_eV)
    piece, left, share = sector_shares(profile, low_eV, high_eV, depth_eV, marks_nm)
    start, end = profile.position_nm[piece], profile.position_nm[piece + 1]
    position = np.append(start + (end - start) * left, profile.end_nm)
    centre = 0.5 * (low_eV + high_eV)
    reach = max(0.5 * (high_eV - low_eV) + depth_eV, 1e-3)
    described = described_sectors(profile, piece, left, share, centre)
    degree = DEGREE if profile.is_parabolic else TWO_BAND_DEGREE
    distinct, kind = np.unique(described, axis=0, return_inverse=True)
    stop_array = np.asarray(stops, dtype=np.float64)
    coefficients = np.empty((stop_array.size, 4, distinct.shape[0], degree + 1))
    for first in range(0, distinct.shape[0], BUILD_BLOCK):
        part = slice(first, first + BUILD_BLOCK)
        coefficients[:, :, part] = sector_series(
            distinct[part], degree=degree, reach=reach, stops=stop_array
        )
    ends = np.stack([described[:, -2], described[:, -2] + described[:, -1]])
    return Sectors(
        position, piece, centre, reach, kind.ravel(), coefficients, stop_array, profile.watch, ends
    )


def matrices(
    sectors: Expanded, energy_eV: Energies, *, forward: bool = False
) -> Iterator[tuple[int, NDArray[Any]]]:
    """Yield the transfer matrices sector by sector, by default from the last to the first.

    Parameters
    ----------
    sectors : Expanded
        As `cut` made them; the matrices are those to the last stop, the right face.
    energy_eV : ndarray, shape (E,), or (B, E) for a family of B profiles
        Real or complex energies inside the window the sectors were cut for.
    forward : bool
        Go from the first sector to the last.

    Yields
    ------
    index : int
        The sector, counted from 0.
    matrix : ndarray, shape (4, E), or (4, B, E)
        Elements a, b, c, d.
    """
    powers, _ = energy_powers(sectors, energy_eV)
    for index, (matrix,) in sectors.each((powers,), forward=forward):
        yield index, matrix


def matrices_and_slopes(
    sectors: Expanded, energy_eV: Energies
) -> Iterator[tuple[int, NDArray[Any], NDArray[Any]]]:
    """As `matrices`, from the last sector to the first, with the derivatives per eV as well."""
    for index, (matrix, slope) in sectors.each(energy_powers(sectors, energy_eV), forward=False):
        yield index, matrix, slope


def all_matrices(sectors: Sectors, energy_eV: Energies, stops: slice = slice(None)) -> NDArray[Any]:
    """Give the matrices to the chosen stops of all sectors at once, shape (P, 4, S, E)."""
    powers, _ = energy_powers(sectors, energy_eV)
    return _product(sectors.coefficients[stops], powers)[:, :, sectors.kind]


def _product(table: FloatArray, powers: NDArray[Any]) -> NDArray[Any]:
    """Multiply coefficients (..., D) with powers (D, E): one real product, also if E is complex."""
    flat = np.ascontiguousarray(table).reshape(-1, table.shape[-1])
    product = (flat @ powers.view(np.float64)).view(powers.dtype)
    return product.reshape(*table.shape[:-1], powers.shape[1])


def energy_powers(sectors: Expanded, energy_eV: Energies) -> tuple[NDArray[Any], NDArray[Any]]:
    """Powers of the scaled energy and their derivatives per eV, each of shape (D, ...)."""
    degree = sectors.coefficients.shape[-1] - 1
    scaled = (energy_eV - sectors.centre_eV) / sectors.reach_eV
    powers = np.empty((degree + 1, *energy_eV.shape), dtype=scaled.dtype)
    powers[0] = 1.0
    for n in range(1, degree + 1):
        np.multiply(powers[n - 1], scaled, out=powers[n])
    slope = np.zeros_like(powers)
    order = np.arange(1, degree + 1).reshape(-1, *(1,) * energy_eV.ndim)
    slope[1:] = powers[:-1] * (order / sectors.reach_eV)
    return powers, slope
