"""The mass of a structure's layers and contacts, and how it goes with the energy.

*Parabolic*: the mass is a number. *Kane*: the two-band model of E. O. Kane, J. Phys. Chem. Solids
1, 249 (1957), in the form that G. Bastard, Phys. Rev. B 24, 5693 (1981), gave it for layers (both
from memory): the mass grows with the height above the local band edge over the local gap::

    m(E, x) = m(x) (1 + (E - V(x)) / Eg(x)) = m(x) + b(x) (E - V(x)),    b = m / Eg

It is linear in the energy, so that the equations of `sectors` stay what they are. The *mass slope*
b, in m0 per eV, is what the engine works with; in a graded layer it goes linearly from face to
face, as the mass does.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from physics.errors import StructureError
from physics.structure import Structure

FloatArray = NDArray[np.float64]

Band = Literal["parabolic", "kane"]
NEEDS_GAP = "the kane band needs it; state gap_eV, or take band = parabolic"


@dataclass(frozen=True, eq=False)
class Masses:
    """Mass at the band edge and mass slope of N layers or pieces of layers, and of the contacts."""

    left: FloatArray
    """Mass at each left face, in m0, shape (N,)."""
    right: FloatArray
    """Mass at each right face, in m0, shape (N,)."""
    slope_left: FloatArray
    """Mass slope at each left face, in m0 per eV, shape (N,); 0 where parabolic."""
    slope_right: FloatArray
    """Mass slope at each right face, in m0 per eV, shape (N,)."""
    contact: tuple[float, float]
    """Mass in the left and in the right contact, in m0."""
    contact_slope: tuple[float, float]
    """Mass slope in the left and in the right contact, in m0 per eV."""

    def pieces(self, layer: NDArray[np.int64], start: FloatArray, stop: FloatArray) -> Masses:
        """Give the masses of pieces of the layers.

        Parameters
        ----------
        layer : ndarray, shape (P,)
            Layer that each piece belongs to, counted from 0.
        start, stop : ndarray, shape (P,)
            Where each piece begins and ends, as shares of its layer's thickness.
        """
        mass = self.left[layer], self.right[layer]
        slope = self.slope_left[layer], self.slope_right[layer]
        return Masses(
            left=_between(*mass, start),
            right=_between(*mass, stop),
            slope_left=_between(*slope, start),
            slope_right=_between(*slope, stop),
            contact=self.contact,
            contact_slope=self.contact_slope,
        )


def masses_of(structure: Structure, band: Band = "parabolic") -> Masses:
    """Give the masses of a structure's layers, of shape (L,), and of its contacts.

    Raises
    ------
    StructureError
        The band is unknown, or it is ``"kane"`` and a layer or a contact states no gap.
    """
    if band not in ("parabolic", "kane"):
        raise StructureError("conditions", "band", band, "a band is parabolic or kane")
    layers, contacts = structure.layers, (structure.left, structure.right)
    left = np.array([layer.mass for layer in layers])
    right = np.array([layer.right_mass for layer in layers])
    contact = (structure.left.mass, structure.right.mass)
    if band == "parabolic":
        zero = np.zeros_like(left)
        return Masses(left, right, zero, zero, contact, (0.0, 0.0))
    names = [f"layer {number}" for number in range(1, len(layers) + 1)]
    gaps = [_gap(name, layer.gap_eV) for name, layer in zip(names, layers, strict=True)]
    to_gaps = [_gap(name, layer.right_gap_eV) for name, layer in zip(names, layers, strict=True)]
    first, last = (
        part.mass / _gap(side, part.gap_eV)
        for side, part in zip(("left", "right"), contacts, strict=True)
    )
    return Masses(
        left, right, left / np.array(gaps), right / np.array(to_gaps), contact, (first, last)
    )


def _gap(where: str, gap_eV: float | None) -> float:
    if gap_eV is None:
        raise StructureError(where, "gap_eV", None, NEEDS_GAP)
    return gap_eV


def _between(first: FloatArray, last: FloatArray, share: FloatArray) -> FloatArray:
    return first * (1.0 - share) + last * share
