"""Structure and bias to band edges over position.

The *uniform* model drops ``bias + built-in`` linearly across the layers between the contacts; the
built-in part lines up the two Fermi levels at zero bias. Where permittivities differ, the
displacement field is continuous, so each layer's field is proportional to 1/permittivity
(J. D. Jackson, Classical Electrodynamics, sec. 4.4, from memory).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from physics.errors import StructureError
from physics.ranges import BIAS_V
from physics.structure import Structure

SAME_EDGE_EV = 1e-14
"""Band edges closer than this differ by rounding."""
ASSUMED_PERMITTIVITY = 12.9
"""Relative permittivity of a layer that states none (GaAs, static); `advise` says so where used."""


def go_on() -> None:
    """Let the work go on: what `Profile.watch` is where nobody watches."""


@dataclass(frozen=True, eq=False)
class Profile:
    """Band edge and mass over position, as linear pieces between flat contacts."""

    position_nm: NDArray[np.float64]
    """Faces of the pieces, shape (P + 1,); 0 at the left contact's face. A screened profile begins
    below 0, in the left contact, and ends in the right one."""
    thickness_nm: NDArray[np.float64]
    """Thickness of each piece, shape (P,); not the faces' difference, which is rounded."""
    edge_left_eV: NDArray[np.float64]
    """Band edge at each piece's left face, shape (P,)."""
    edge_right_eV: NDArray[np.float64]
    """Band edge at each piece's right face, shape (P,)."""
    mass_left: NDArray[np.float64]
    """Mass at each piece's left face, in m0, shape (P,)."""
    mass_right: NDArray[np.float64]
    """Mass at each piece's right face, in m0, shape (P,)."""
    layer_index: NDArray[np.int64]
    """Index of the layer that each piece belongs to, counted from 0, shape (P,); -1 in the left
    contact and the number of layers in the right one, where pieces lie in contacts."""
    contact_edge_eV: tuple[float, float]
    """Band edge in the left and in the right contact, bias included."""
    contact_mass: tuple[float, float]
    """Mass in the left and in the right contact, in m0."""
    watch: Callable[[], None] = go_on
    """Called again and again while something is computed; by raising it ends the work."""

    @property
    def start_nm(self) -> float:
        """Where the first piece begins."""
        return float(self.position_nm[0])

    @property
    def end_nm(self) -> float:
        """Where the last piece ends."""
        return float(self.position_nm[-1])

    @property
    def length_nm(self) -> float:
        """Length of all pieces together."""
        return self.end_nm - self.start_nm

    @property
    def layer_count(self) -> int:
        """Number of layers; what lies in contacts is none."""
        last = int(self.layer_index[-1])
        return last if self.layer_index[0] < 0 else last + 1

    def layer_pieces(self, index: int) -> slice:
        """Give the pieces of a layer, counted from 0."""
        first, stop = np.searchsorted(self.layer_index, [index, index + 1])
        return slice(int(first), int(stop))

    def layer_edges_eV(self, index: int) -> tuple[float, float]:
        """Band edge at a layer's left and right face."""
        pieces = self.layer_pieces(index)
        return float(self.edge_left_eV[pieces.start]), float(self.edge_right_eV[pieces.stop - 1])

    @property
    def faces_nm(self) -> tuple[float, float]:
        """Left face of the first and right face of the last layer."""
        first, last = self.layer_pieces(0), self.layer_pieces(self.layer_count - 1)
        return float(self.position_nm[first.start]), float(self.position_nm[last.stop])

    @property
    def lowest_eV(self) -> float:
        """Lowest band edge anywhere, contacts included."""
        return float(min(self.edge_left_eV.min(), self.edge_right_eV.min(), *self.contact_edge_eV))

    @property
    def highest_eV(self) -> float:
        """Highest band edge anywhere, contacts included."""
        return float(max(self.edge_left_eV.max(), self.edge_right_eV.max(), *self.contact_edge_eV))

    def edge_eV(self, position_nm: NDArray[np.float64]) -> NDArray[np.float64]:
        """Band edge at each position, in the shape given; at a face, the piece to its right."""
        x = np.asarray(position_nm, dtype=np.float64)
        piece = np.searchsorted(self.position_nm, x, side="right") - 1
        inside = np.clip(piece, 0, self.edge_left_eV.size - 1)
        start = self.position_nm[inside]
        share = (x - start) / (self.position_nm[inside + 1] - start)
        edge = self.edge_left_eV[inside] * (1.0 - share) + self.edge_right_eV[inside] * share
        edge = np.where(x < self.start_nm, self.contact_edge_eV[0], edge)
        return np.where(x > self.end_nm, self.contact_edge_eV[1], edge)


def without_runways(profile: Profile) -> Profile:
    """Take away what at either end goes on just as the contact does, as an unbiased spacer.

    Where the contact begins is then a matter of words: T, R and the poles are the same, but a wave
    that fades or grows over a long runway would drown what is computed in rounding.
    """
    edges = np.stack([profile.edge_left_eV, profile.edge_right_eV])
    masses = np.stack([profile.mass_left, profile.mass_right])
    like = [
        (np.abs(edges - edge) <= SAME_EDGE_EV).all(axis=0) & (masses == mass).all(axis=0)
        for edge, mass in zip(profile.contact_edge_eV, profile.contact_mass, strict=True)
    ]
    count = profile.thickness_nm.size
    first = int(np.argmin(np.append(like[0], False)))
    last = count - int(np.argmin(np.append(like[1][::-1], False)))
    first, last = (first, last) if first < last else (0, 1)
    kept = slice(first, last)
    return replace(
        profile,
        position_nm=profile.position_nm[first : last + 1] - profile.position_nm[first],
        thickness_nm=profile.thickness_nm[kept],
        edge_left_eV=profile.edge_left_eV[kept],
        edge_right_eV=profile.edge_right_eV[kept],
        mass_left=profile.mass_left[kept],
        mass_right=profile.mass_right[kept],
        layer_index=profile.layer_index[kept],
    )


def built_in_eV(structure: Structure) -> float:
    """Drop across the layers at zero bias: what lines up the Fermi levels of the two contacts."""
    left, right = structure.left, structure.right
    if left.fermi_eV is None or right.fermi_eV is None:
        return 0.0
    return (right.edge_eV + right.fermi_eV) - (left.edge_eV + left.fermi_eV)


def uniform_field(structure: Structure, bias_V: float = 0.0) -> Profile:
    """Lay the uniform field of a bias over a structure.

    Parameters
    ----------
    structure : Structure
        The layers and contacts.
    bias_V : float
        Right contact relative to the left; positive lowers the right contact's band edge.

    Returns
    -------
    Profile
        One linear piece a layer.

    Raises
    ------
    StructureError
        The bias is not a number or outside `BIAS_V`.
    """
    if not BIAS_V.holds(bias_V):
        raise StructureError("conditions", "bias_V", bias_V, BIAS_V.allowed)
    layers = structure.layers
    thickness = np.array([layer.thickness_nm for layer in layers])
    permittivity = np.array(
        [
            ASSUMED_PERMITTIVITY if layer.permittivity is None else layer.permittivity
            for layer in layers
        ]
    )
    position = np.concatenate(([0.0], np.cumsum(thickness)))
    weight = np.concatenate(([0.0], np.cumsum(thickness / permittivity)))
    drop = (bias_V + built_in_eV(structure)) * (weight / weight[-1])
    return Profile(
        position_nm=position,
        thickness_nm=thickness,
        edge_left_eV=np.array([layer.edge_eV for layer in layers]) - drop[:-1],
        edge_right_eV=np.array([layer.right_edge_eV for layer in layers]) - drop[1:],
        mass_left=np.array([layer.mass for layer in layers]),
        mass_right=np.array([layer.right_mass for layer in layers]),
        layer_index=np.arange(len(layers), dtype=np.int64),
        contact_edge_eV=(structure.left.edge_eV, structure.right.edge_eV - float(drop[-1])),
        contact_mass=(structure.left.mass, structure.right.mass),
    )
