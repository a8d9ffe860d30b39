"""Where a profile is cut into sectors, and what the series wants to know of each."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C_EV_NM2
from physics.errors import StructureError
from physics.field import Profile

FloatArray = NDArray[np.float64]

SECTOR_PHASE = 1.5
"""Largest (wavevector x length) of a sector: the series loses less than one digit up to here."""
MAX_SECTORS = 400_000
"""A stack that needs more is refused rather than left to run for hours."""


def described_sectors(
    profile: Profile,
    piece: NDArray[np.int64],
    left: FloatArray,
    share: FloatArray,
    centre_eV: float,
) -> FloatArray:
    """Give what `sector_series` wants to know of each sector, shape (S, 7).

    ``piece``, ``left`` and ``share``, each of shape (S,), say which piece a sector belongs to, at
    which share of it the sector begins and which share of it the sector is.
    """
    edge_rise = (profile.edge_right_eV - profile.edge_left_eV)[piece]
    mass_rise = (profile.mass_right - profile.mass_left)[piece]
    slope_rise = (profile.mass_slope_right - profile.mass_slope_left)[piece]
    return np.stack(
        [
            share * profile.thickness_nm[piece],
            profile.edge_left_eV[piece] + edge_rise * left - centre_eV,
            edge_rise * share,
            profile.mass_left[piece] + mass_rise * left,
            mass_rise * share,
            profile.mass_slope_left[piece] + slope_rise * left,
            slope_rise * share,
        ],
        axis=1,
    )


def sector_shares(
    profile: Profile,
    low_eV: float,
    high_eV: float,
    depth_eV: float,
    marks_nm: FloatArray | None,
) -> tuple[NDArray[np.int64], FloatArray, FloatArray]:
    """Piece of each sector, where in the piece it begins and how much of it it is, as shares."""
    number = sectors_per_piece(profile, low_eV, high_eV, depth_eV)
    if int(number.sum()) > MAX_SECTORS:
        allowed = f"it needs more than {MAX_SECTORS} sectors at these energies; make it thinner"
        raise StructureError("stack", "thickness_nm", profile.length_nm, allowed)
    piece, left, share = even_shares(number)
    if marks_nm is None:
        return piece, left, share
    piece, left = _with_marks(profile, piece, left, marks_nm)
    last = np.append(piece[1:] != piece[:-1], True)
    return piece, left, np.where(last, 1.0, np.append(left[1:], 1.0)) - left


def even_shares(number: NDArray[np.int64]) -> tuple[NDArray[np.int64], FloatArray, FloatArray]:
    """Cut every piece evenly: piece of each sector, where in it it begins and its share of it."""
    piece = np.repeat(np.arange(number.size), number)
    rank = np.arange(piece.size) - np.repeat(np.cumsum(number) - number, number)
    return piece, rank / number[piece], 1.0 / number[piece]


def sectors_per_piece(
    profile: Profile, low_eV: float, high_eV: float, depth_eV: float
) -> NDArray[np.int64]:
    """Count the sectors that each piece needs, shape (P,)."""
    ends = np.stack([profile.edge_left_eV, profile.edge_right_eV])
    distance = np.maximum(np.abs(ends - low_eV), np.abs(ends - high_eV)).max(axis=0)
    mass = np.maximum(profile.mass_left, profile.mass_right)
    if not profile.is_parabolic:
        mass = _largest_mass(profile, mass, high_eV, depth_eV)
    wavevector = np.sqrt(mass * np.hypot(distance, depth_eV) / C_EV_NM2)
    length = np.diff(profile.position_nm)
    number: NDArray[np.int64] = np.ceil(wavevector * length / SECTOR_PHASE).astype(np.int64)
    return np.maximum(number, 1)


def _largest_mass(
    profile: Profile, mass: FloatArray, high_eV: float, depth_eV: float
) -> FloatArray:
    """Bound |m(E)| in each piece for energies up to ``high_eV``, shape (P,)."""
    slopes = np.stack([profile.mass_slope_left, profile.mass_slope_right])
    above = high_eV - np.minimum(profile.edge_left_eV, profile.edge_right_eV)
    grown = mass + (slopes * above).max(axis=0)
    bound: FloatArray = np.hypot(grown, slopes.max(axis=0) * depth_eV)
    return bound


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
