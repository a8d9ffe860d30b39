"""Structure and bias to band edges over position.

The *uniform* model drops ``bias + built-in`` linearly across the layers between the contacts; the
built-in part lines up the two Fermi levels at zero bias. Where permittivities differ, the
displacement field is continuous, so each layer's field is proportional to 1/permittivity
(J. D. Jackson, Classical Electrodynamics, sec. 4.4, from memory).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from physics.band import Band, masses_of
from physics.errors import EnergyError, StructureError
from physics.ranges import BIAS_V
from physics.structure import Structure

Energies = NDArray[np.float64] | NDArray[np.complex128]

FloatArray = NDArray[np.float64]

SAME_EDGE_EV = 1e-14
"""Band edges closer than this differ by rounding."""
ASSUMED_PERMITTIVITY = 12.9
"""Relative permittivity of a layer that states none (GaAs, static); `advise` says so where used."""


def go_on() -> None:
    """Let the work go on: what `Profile.watch` is where nobody watches."""


def _unsaid() -> NDArray[np.float64]:
    return np.empty(0)


@dataclass(frozen=True, eq=False)
class Profile:
    """Band edge and mass over position, as linear pieces between flat contacts.

    The mass at an energy E is ``m + b (E - V)`` with the mass slope b (`physics.band`).
    """

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
    """Mass at the band edge at each piece's left face, in m0, shape (P,)."""
    mass_right: NDArray[np.float64]
    """Mass at the band edge at each piece's right face, in m0, shape (P,)."""
    layer_index: NDArray[np.int64]
    """Index of the layer that each piece belongs to, counted from 0, shape (P,); -1 in the left
    contact and the number of layers in the right one, where pieces lie in contacts."""
    contact_edge_eV: tuple[float, float]
    """Band edge in the left and in the right contact, bias included."""
    contact_mass: tuple[float, float]
    """Mass at the band edge in the left and in the right contact, in m0."""
    watch: Callable[[], None] = go_on
    """Called again and again while something is computed; by raising it ends the work."""
    mass_slope_left: NDArray[np.float64] = field(default_factory=_unsaid)
    """Growth of the mass with E - V at each left face, in m0 per eV, shape (P,); unsaid: 0."""
    mass_slope_right: NDArray[np.float64] = field(default_factory=_unsaid)
    """The same at each piece's right face, shape (P,)."""
    contact_mass_slope: tuple[float, float] = (0.0, 0.0)
    """The same in the left and in the right contact."""

    def __post_init__(self) -> None:
        for name in ("mass_slope_left", "mass_slope_right"):
            if getattr(self, name).size == 0:
                object.__setattr__(self, name, np.zeros(self.mass_left.shape))

    @property
    def is_parabolic(self) -> bool:
        """Whether no mass goes with the energy."""
        pieces = self.mass_slope_left.any() or self.mass_slope_right.any()
        return not (pieces or any(self.contact_mass_slope))

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
    slopes = np.stack([profile.mass_slope_left, profile.mass_slope_right])
    like = [
        (np.abs(edges - profile.contact_edge_eV[side]) <= SAME_EDGE_EV).all(axis=0)
        & (masses == profile.contact_mass[side]).all(axis=0)
        & (slopes == profile.contact_mass_slope[side]).all(axis=0)
        for side in (0, 1)
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
        mass_slope_left=profile.mass_slope_left[kept],
        mass_slope_right=profile.mass_slope_right[kept],
        layer_index=profile.layer_index[kept],
    )


def valence_top(profile: Profile) -> tuple[float, str]:
    """Find the highest energy at which a two-band mass is 0 somewhere, the top of a valence band.

    Returns
    -------
    energy_eV : float
        Largest of ``V - m / b``; -inf where every mass is parabolic.
    where : str
        The layer or contact, as `StructureError` names it.
    """
    if profile.is_parabolic:
        return -np.inf, ""
    tops = _piece_tops_eV(profile)
    at = int(np.argmax(tops))
    found = [(float(tops[at]), f"layer {int(profile.layer_index[at]) + 1}")]
    for side, name in enumerate(("left", "right")):
        slope = profile.contact_mass_slope[side]
        if slope:
            top = profile.contact_edge_eV[side] - profile.contact_mass[side] / slope
            found.append((top, name))
    return max(found, key=lambda item: item[0])


def _piece_tops_eV(profile: Profile) -> NDArray[np.float64]:
    """Largest V - m / b in each piece, shape (P,), -inf for a parabolic one."""
    b0, b1 = profile.mass_slope_left, profile.mass_slope_right - profile.mass_slope_left
    m0, m1 = profile.mass_left, profile.mass_right - profile.mass_left
    v0, v1 = profile.edge_left_eV, profile.edge_right_eV - profile.edge_left_eV
    with np.errstate(divide="ignore", invalid="ignore"):
        # Inside a piece the derivative is 0 where b^2 = (m1 b0 - m0 b1) / v1.
        turn = (np.sqrt((m1 * b0 - m0 * b1) / v1) - b0) / b1
        inner = np.where(np.isfinite(turn), np.clip(turn, 0.0, 1.0), 0.0)
        shares = np.stack([np.zeros_like(inner), inner, np.ones_like(inner)])
        slope = b0 + b1 * shares
        top = v0 + v1 * shares - (m0 + m1 * shares) / slope
    highest: NDArray[np.float64] = np.where(slope > 0.0, top, -np.inf).max(axis=0)
    return highest


def require_above_valence(profile: Profile, energy_eV: float) -> None:
    """Refuse an energy at which the mass is not above 0 everywhere.

    Raises
    ------
    EnergyError
        It names the layer or contact, and the lowest energy allowed.
    """
    top, where = valence_top(profile)
    if not energy_eV > top:
        allowed = (np.floor(top * 1e4) + 1.0) / 1e4  # to be typed in
        raise EnergyError(
            f"{where}: {energy_eV:g} eV lies in its valence band, where band = kane has no mass "
            f"above 0; energies from {allowed:.8g} eV on are allowed"
        )


def built_in_eV(structure: Structure) -> float:
    """Drop across the layers at zero bias: what lines up the Fermi levels of the two contacts."""
    left, right = structure.left, structure.right
    if left.fermi_eV is None or right.fermi_eV is None:
        return 0.0
    return (right.edge_eV + right.fermi_eV) - (left.edge_eV + left.fermi_eV)


def uniform_field(
    structure: Structure, bias_V: float = 0.0, *, band: Band = "parabolic"
) -> Profile:
    """Lay the uniform field of a bias over a structure.

    Parameters
    ----------
    structure : Structure
        The layers and contacts.
    bias_V : float
        Right contact relative to the left; positive lowers the right contact's band edge.
    band : {"parabolic", "kane"}
        Whether the mass goes with the energy (`physics.band`).

    Returns
    -------
    Profile
        One linear piece a layer.

    Raises
    ------
    StructureError
        The bias is not a number or outside `BIAS_V`, or the band needs a gap that is not stated.
    """
    if not BIAS_V.holds(bias_V):
        raise StructureError("conditions", "bias_V", bias_V, BIAS_V.allowed)
    layers, masses = structure.layers, masses_of(structure, band)
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
        mass_left=masses.left,
        mass_right=masses.right,
        layer_index=np.arange(len(layers), dtype=np.int64),
        contact_edge_eV=(structure.left.edge_eV, structure.right.edge_eV - float(drop[-1])),
        contact_mass=masses.contact,
        mass_slope_left=masses.slope_left,
        mass_slope_right=masses.slope_right,
        contact_mass_slope=masses.contact_slope,
    )
