"""What a profile, or a family of profiles, says of its contacts."""

from __future__ import annotations

from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
Energies = NDArray[np.float64] | NDArray[np.complex128]


class Contacts(Protocol):
    """What scattering wants to know of the contacts, of one profile or of a family of them."""

    @property
    def contact_edge_eV(self) -> tuple[float, float] | tuple[FloatArray, FloatArray]:
        """Band edge in the left and in the right contact, bias included."""

    @property
    def contact_mass(self) -> tuple[float, float] | tuple[FloatArray, FloatArray]:
        """Mass at the edge of the left and of the right contact, in m0."""

    @property
    def contact_mass_slope(self) -> tuple[float, float] | tuple[FloatArray, FloatArray]:
        """Mass slopes of the left and of the right contact, in m0 per eV."""


class Layered(Contacts, Protocol):
    """The same, and which layer each piece belongs to."""

    @property
    def layer_index(self) -> NDArray[np.int64]:
        """Index of the layer that each piece belongs to, counted from 0, shape (P,)."""


def contact_mass_at(profile: Contacts, side: int, energy_eV: Energies) -> Any:
    """Mass of the left (0) or right (1) contact at real or complex energies, in m0.

    In the shape of the energies; not laid out over them where the contact is parabolic.
    """
    mass, slope = profile.contact_mass[side], profile.contact_mass_slope[side]
    return mass + slope * (energy_eV - profile.contact_edge_eV[side]) if np.any(slope) else mass
