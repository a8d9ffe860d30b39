"""Many profiles of like pieces, computed side by side: one stack at many biases, say.

All members are cut into the same sectors, so that one pass over the sectors serves all of them;
every kernel that works elementwise on energies (`scattering`, `outgoing`) takes a family where it
takes a profile. Energies then have the shape (B, E), one row a member. In Python the cost of a pass
is that of its calls; side by side they are made once for all members.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from physics.cuts import MAX_SECTORS, described_sectors, even_shares, sectors_per_piece
from physics.errors import StructureError
from physics.field import Profile, require_above_valence
from physics.frobenius import DEGREE, TWO_BAND_DEGREE, sector_series
from physics.sectors import BUILD_BLOCK

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Family:
    """Profiles that differ in numbers, not in the count of their pieces."""

    members: tuple[Profile, ...]
    contact_edge_eV: tuple[FloatArray, FloatArray]
    """Band edge in the left and in the right contacts, each of shape (B, 1)."""
    contact_mass: tuple[FloatArray, FloatArray]
    """Mass in the left and in the right contacts, in m0, each of shape (B, 1)."""
    contact_mass_slope: tuple[FloatArray, FloatArray]
    """Their mass slopes, in m0 per eV, each of shape (B, 1)."""

    @property
    def watch(self) -> Callable[[], None]:
        """What the first member calls while something is computed."""
        return self.members[0].watch

    @property
    def layer_index(self) -> NDArray[np.int64]:
        """Index of the layer that each piece belongs to, shape (P,)."""
        return self.members[0].layer_index

    def rows(self, index: NDArray[np.int64]) -> Family:
        """Give some of the members."""
        return family_of([self.members[n] for n in index.tolist()])


@dataclass(frozen=True, eq=False)
class FamilySectors:
    """Sectors of a family, with their transfer matrices as polynomials in the energy."""

    piece_index: NDArray[np.int64]
    """Piece that each sector belongs to, shape (S,)."""
    centre_eV: FloatArray
    """Energy about which each member's polynomials are expanded, shape (B, 1)."""
    reach_eV: FloatArray
    """Energy distance that the expansion variable is scaled by, shape (B, 1)."""
    coefficients: FloatArray
    """Shape (S, B, 4, D): sector, member, element (a, b, c, d), power of the energy."""
    watch: Callable[[], None]

    @property
    def count(self) -> int:
        """Number of sectors."""
        return self.piece_index.size

    def some(self, chosen: NDArray[np.bool_]) -> FamilySectors:
        """Give some of the sectors."""
        return replace(
            self, piece_index=self.piece_index[chosen], coefficients=self.coefficients[chosen]
        )

    def rows(self, index: NDArray[np.int64]) -> FamilySectors:
        """Give the sectors of some of the members."""
        return replace(
            self,
            centre_eV=self.centre_eV[index],
            reach_eV=self.reach_eV[index],
            coefficients=self.coefficients[:, index],
        )

    def each(
        self, powers: tuple[NDArray[Any], ...], *, forward: bool
    ) -> Iterator[tuple[int, list[NDArray[Any]]]]:
        """Yield each sector with its products, (4, B, E) for every set of powers (D, B, E)."""
        self.watch()
        by_member = [np.ascontiguousarray(np.moveaxis(power, 0, 1)) for power in powers]
        order = range(self.count)
        for index in order if forward else reversed(order):
            table = self.coefficients[index]  # (B, 4, D)
            products = [(table @ p.view(np.float64)).view(p.dtype) for p in by_member]
            yield index, [product.transpose(1, 0, 2) for product in products]


def family_of(profiles: Sequence[Profile]) -> Family:
    """Put profiles of like pieces side by side."""
    edges = np.array([profile.contact_edge_eV for profile in profiles])
    masses = np.array([profile.contact_mass for profile in profiles])
    slopes = np.array([profile.contact_mass_slope for profile in profiles])
    return Family(
        tuple(profiles),
        (edges[:, :1], edges[:, 1:]),
        (masses[:, :1], masses[:, 1:]),
        (slopes[:, :1], slopes[:, 1:]),
    )


def cut_family(
    family: Family, low_eV: FloatArray, high_eV: FloatArray, *, depth_eV: float = 0.0
) -> FamilySectors:
    """Cut a family for energies in a window of each member.

    Parameters
    ----------
    low_eV, high_eV : ndarray, shape (B,)
        The windows of the energy's real part.
    depth_eV : float
        Largest distance of a complex energy from the real axis.

    Raises
    ------
    StructureError
        More than `MAX_SECTORS` sectors would be needed.
    EnergyError
        A window reaches into a valence band.
    """
    members = family.members
    for member, low in zip(members, low_eV.tolist(), strict=True):
        require_above_valence(member, low)
    ends = zip(members, low_eV.tolist(), high_eV.tolist(), strict=True)
    number = np.max(
        [sectors_per_piece(member, low, high, depth_eV) for member, low, high in ends], axis=0
    )
    if int(number.sum()) > MAX_SECTORS:
        allowed = f"it needs more than {MAX_SECTORS} sectors at these energies; make it thinner"
        raise StructureError("stack", "thickness_nm", members[0].length_nm, allowed)
    piece, left, share = even_shares(number)
    centre = 0.5 * (low_eV + high_eV)
    reach = np.maximum(0.5 * (high_eV - low_eV) + depth_eV, 1e-3)
    described = np.stack(
        [
            described_sectors(member, piece, left, share, middle)
            for member, middle in zip(members, centre.tolist(), strict=True)
        ],
        axis=1,
    )  # (S, B, 7)
    degree = DEGREE if all(member.is_parabolic for member in members) else TWO_BAND_DEGREE
    flat = described.reshape(-1, described.shape[-1])
    coefficients = _series(flat, degree, np.tile(reach, piece.size))
    coefficients = coefficients.reshape(piece.size, len(members), *coefficients.shape[1:])
    return FamilySectors(piece, centre[:, None], reach[:, None], coefficients, family.watch)


def _series(described: FloatArray, degree: int, reach_eV: FloatArray) -> FloatArray:
    """Sum the series of sectors with a reach of their own, shape (S, 4, D)."""
    parts = []
    for first in range(0, reach_eV.size, BUILD_BLOCK):
        part = slice(first, first + BUILD_BLOCK)
        reach = reach_eV[part, None]
        series = sector_series(described[part], degree=degree, reach=reach, stops=np.ones(1))
        parts.append(series[0])
    return np.ascontiguousarray(np.moveaxis(np.concatenate(parts, axis=1), 0, 1))
