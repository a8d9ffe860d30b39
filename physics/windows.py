"""Windows of energy: checked, and cut where a contact opens."""

from __future__ import annotations

import itertools

from physics.errors import EnergyError
from physics.field import Profile

WINDOW_LIMIT_EV = 200.0
SAME_EV = 1e-13
"""Energies closer than this are one energy."""


def check_window(from_eV: float, to_eV: float, max_width_eV: float) -> None:
    """Refuse a window or a largest width that makes no sense."""
    if not (abs(from_eV) <= WINDOW_LIMIT_EV and abs(to_eV) <= WINDOW_LIMIT_EV):
        raise EnergyError(f"an energy lies between -{WINDOW_LIMIT_EV:g} and {WINDOW_LIMIT_EV:g} eV")
    if not from_eV < to_eV:
        raise EnergyError(f"the window from {from_eV:g} to {to_eV:g} eV is empty")
    if not 0.0 < max_width_eV <= WINDOW_LIMIT_EV:
        raise EnergyError(f"the largest width is {max_width_eV:g} eV; it has to be above 0")


def strips(profile: Profile, from_eV: float, to_eV: float) -> list[tuple[float, float]]:
    """Cut a window at the contacts' edges, but for cuts that only rounding sets apart."""
    edges = sorted(edge for edge in profile.contact_edge_eV if from_eV < edge < to_eV)
    ends = [from_eV]
    ends += [edge for edge in edges if to_eV - edge > SAME_EV]
    kept = [end for n, end in enumerate(ends) if n == 0 or end - ends[n - 1] > SAME_EV]
    return list(itertools.pairwise([*kept, to_eV]))
