"""States of a family's closed stacks, which begin the search for its poles (`resonances`)."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from physics.family import Family, FamilySectors
from physics.outgoing import Sheet, states_below
from physics.windows import SAME_EV

FloatArray = NDArray[np.float64]

TRIALS = 8
"""Parts that a bracket is cut into at once: with many members few cost less than many."""
OTHER_WALL_EV_NM = 1e3
"""A wall all but impenetrable, against one that lets the wave stand free."""
OPEN = Sheet(left_open=True, right_open=True)


def between_walls(family: Family, sectors: FamilySectors, low_eV: FloatArray) -> NDArray[np.bool_]:
    """Say which sectors lie between the outermost ones that forbid the lowest energy, shape (S,).

    What lies outside is open to its contact all the way at any energy of the window: a state there
    leaves as fast as it came. The closed stack's walls stand where it begins.
    """
    forbids = np.zeros(family.members[0].thickness_nm.size, dtype=bool)
    for member, low in zip(family.members, low_eV.tolist(), strict=True):
        forbids |= np.maximum(member.edge_left_eV, member.edge_right_eV) > low + SAME_EV
    where = np.flatnonzero(forbids[sectors.piece_index])
    inside = np.zeros(sectors.count, dtype=bool)
    if where.size:
        inside[where[0] : where[-1] + 1] = True
    return inside


def closed_family_energies(
    family: Family,
    sectors: FamilySectors,
    low_eV: FloatArray,
    high_eV: FloatArray,
    start_eV: float,
) -> FloatArray:
    """Energies of the closed stacks' states in the windows, shape (B, R), filled up with nan."""
    ends = states_below(family, sectors, OPEN, np.stack([low_eV, high_eV], axis=1))
    number = ends[:, 1] - ends[:, 0]
    rank = ends[:, :1] + np.arange(int(number.max()))  # (B, R)
    lower = np.broadcast_to(low_eV[:, None], rank.shape)
    upper = np.broadcast_to(high_eV[:, None], rank.shape)
    share = np.linspace(0.0, 1.0, TRIALS + 1)
    while rank.size and float((upper - lower).max()) > start_eV:
        trial = lower[..., None] + (upper - lower)[..., None] * share  # (B, R, T)
        inner = trial[..., 1:-1].reshape(rank.shape[0], -1)
        count = states_below(family, sectors, OPEN, inner).reshape(*rank.shape, -1)
        passed = (count <= rank[..., None]).sum(axis=-1)[..., None]
        lower = np.take_along_axis(trial, passed, axis=-1)[..., 0]
        upper = np.take_along_axis(trial, passed + 1, axis=-1)[..., 0]
    there = np.arange(rank.shape[1]) < number[:, None]
    return np.where(there, 0.5 * (lower + upper), np.nan)


def still_there(
    family: Family, sectors: FamilySectors, closed_eV: FloatArray, reach_eV: float
) -> NDArray[np.bool_]:
    """Say which closed states are within reach of their place behind another wall, too."""
    asked = np.isfinite(closed_eV)
    if not asked.any():
        return asked
    middle = np.where(asked, closed_eV, sectors.centre_eV)
    ends = np.concatenate([middle - reach_eV, middle + reach_eV], axis=1)
    count = states_below(family, sectors, OPEN, ends, OTHER_WALL_EV_NM)
    jump = count[:, middle.shape[1] :] - count[:, : middle.shape[1]]
    return np.asarray(asked & (jump > 0))
