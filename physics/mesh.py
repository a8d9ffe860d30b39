"""Elements to solve Poisson's equation on: the stack with a run of each contact beside it.

An element is three nodes, its faces and its middle, between which the potential is a parabola;
the nodes are where the linear pieces of a `Profile` meet. Every quantity that differs between
layers is constant or linear in an element, and every face of a layer is a face of elements.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from physics.constants import (
    BOLTZMANN_EV_PER_K,
    ELECTRIC_CONSTANT_F_PER_M,
    ELEMENTARY_CHARGE_C,
)
from physics.errors import StructureError
from physics.field import ASSUMED_PERMITTIVITY, built_in_eV
from physics.occupation import band_density_cm3, donors_from_fermi, fermi_dirac_half
from physics.region import Region, faces_nm, tunnelling_region
from physics.structure import Contact, Structure

FloatArray = NDArray[np.float64]

EPS0_PER_V_NM = ELECTRIC_CONSTANT_F_PER_M / ELEMENTARY_CHARGE_C * 1e-9
"""Electric constant in elementary charges per V and nm."""
NM3_PER_CM3 = 1e-21
"""Density in nm^-3 of one in cm^-3."""
BUFFER_LENGTHS = 18.0
"""Screening lengths of contact beside the stack, beyond what the voltage can deplete: the band's
bending has faded by exp(-18), from 1 eV to some 1e-8 eV."""
LONGEST_BUFFER_NM = 2e5
"""A contact that needs a longer run to screen in is refused."""
GROWTH = 1.1
"""Ratio of neighbouring elements in the buffers of a first mesh."""
FIRST_STEP_NM = 1.0
LENGTHS_PER_STEP = 3.0
"""Elements a screening length of a first mesh, and how coarse they may be."""
CHORD_EV = 1e-4
"""How far the curved edge may depart from the chord of a piece."""
MOST_PIECES, MOST_PIECES_PER_NM = 250, 4.0
"""Pieces allowed for a stack, whichever is more; beyond, `CHORD_EV` is given up."""
SLOPE = 0.3
"""Most by which an element may be longer than one at unit distance from it."""
WAVE_STEP_NM = 1.0
"""Longest element where electrons are waves; two pieces and five nodes a nanometre."""


@dataclass(frozen=True, eq=False)
class Mesh:
    """E elements and what they are made of; 2 E + 1 nodes."""

    face_nm: FloatArray
    """Faces of the elements, shape (E + 1,); the left contact's face is 0."""
    layer_index: NDArray[np.int64]
    """Layer of each element, -1 in the left contact and the layers' number in the right one."""
    edge_eV: FloatArray
    """Unbent band edge at each element's nodes, shape (E, 3)."""
    mass: FloatArray
    """Mass in m0, shape (E, 3)."""
    permittivity: FloatArray
    """Permittivity in elementary charges per V and nm, shape (E,)."""
    donors_nm3: FloatArray
    """Ionised donors, shape (E,)."""
    side: NDArray[np.int64]
    """-1 where the left Fermi level rules, 1 where the right one does, 0 in the tunnelling
    region; shape (E,)."""
    region: Region
    temperature_K: float
    range_V: tuple[float, float]
    """Biases that it was made for."""
    waves: bool = False
    """Whether it is fine enough for waves in the tunnelling region."""
    bent_nm: tuple[float, float] = (-np.inf, np.inf)
    """Outside of this the band is as good as flat at all of them."""

    @property
    def bent(self) -> slice:
        """Elements that a wave needs to see; outside of them there is contact."""
        first, stop = np.searchsorted(self.face_nm, self.bent_nm)
        return slice(int(first), min(int(stop), self.permittivity.size))

    @property
    def step_nm(self) -> FloatArray:
        """Length of each element, shape (E,)."""
        return np.diff(self.face_nm)

    @property
    def stack_nm(self) -> float:
        """Distance between the contacts' faces."""
        in_stack = (self.layer_index >= 0) & (self.layer_index < self.layer_index[-1])
        return float(self.step_nm[in_stack].sum())

    @property
    def node_nm(self) -> FloatArray:
        """Positions of all nodes, shape (2 E + 1,)."""
        return with_middles(self.face_nm)


def with_middles(face: FloatArray) -> FloatArray:
    """Put the mean between each two of (E + 1,) numbers."""
    node = np.empty(2 * face.size - 1)
    node[::2] = face
    node[1::2] = 0.5 * (face[1:] + face[:-1])
    return node


@dataclass(frozen=True)
class Slab:
    """A stretch of one material with its element faces."""

    layer: int
    face: FloatArray
    edge: tuple[float, float]
    mass: tuple[float, float]
    permittivity: float
    donors_nm3: float
    ends: tuple[float, float]
    """Where edge and mass hold; beyond the faces if the stretch is part of a layer."""


def contact_density_cm3(contact: Contact, where: str, temperature_K: float) -> float:
    """Give the donors that make a contact neutral far away.

    Raises
    ------
    StructureError
        The contact has no Fermi energy.
    """
    if contact.fermi_eV is None:
        allowed = "the screened field needs one; give the contact donors_cm3 or fermi_eV"
        raise StructureError(where, "fermi_eV", None, allowed)
    return donors_from_fermi(contact.fermi_eV, contact.mass, temperature_K)


def screening_length_nm(contact: Contact, temperature_K: float) -> float:
    """Debye's length of a contact, or Thomas and Fermi's where it is degenerate, and in between.

    ``sqrt(eps / (e dn/dmu))`` (N. W. Ashcroft and N. D. Mermin, Solid State Physics, ch. 17, from
    memory); inf where the contact holds no electron to speak of.
    """
    kT = BOLTZMANN_EV_PER_K * temperature_K
    _, slope = fermi_dirac_half((contact.fermi_eV or 0.0) / kT)
    density = band_density_cm3(contact.mass, temperature_K) * NM3_PER_CM3
    stiffness = density * 2.0 / math.sqrt(math.pi) * float(slope) / kT
    return math.sqrt(_permittivity(contact.permittivity) / stiffness) if stiffness else math.inf


def first_mesh(
    structure: Structure,
    temperature_K: float,
    range_V: tuple[float, float],
    lengthened: float = 1.0,
) -> Mesh:
    """Lay a mesh before anything is known of the charge.

    Parameters
    ----------
    structure : Structure
        Both contacts with a Fermi energy.
    temperature_K : float
        Temperature of lattice and carriers.
    range_V : tuple of float
        Lowest and highest bias.
    lengthened : float
        Factor on the length of both buffers.

    Raises
    ------
    StructureError
        A contact has no Fermi energy, or too few electrons to screen.
    """
    drop = max(abs(voltage + built_in_eV(structure)) for voltage in range_V)
    left, right = structure.left, structure.right
    lengths = [
        lengthened * _buffer_nm(contact, where, temperature_K, drop)
        for contact, where in ((left, "left"), (right, "right"))
    ]
    steps = [
        min(FIRST_STEP_NM, screening_length_nm(contact, temperature_K) / LENGTHS_PER_STEP)
        for contact in (left, right)
    ]
    region = tunnelling_region(structure)
    runs = [growing_faces(length, step) for length, step in zip(lengths, steps, strict=True)]
    end = faces_nm(structure)[-1]
    slabs = [
        _contact_slab(left, "left", -1, -runs[0][::-1], temperature_K),
        *_layer_slabs(structure, region, min(steps)),
        _contact_slab(right, "right", len(structure.layers), end + runs[1], temperature_K),
    ]
    return _mesh(slabs, region, temperature_K, range_V)


def mesh_of_slabs(slabs: list[Slab], like: Mesh) -> Mesh:
    """Put stretches together to a mesh for the same conditions as another."""
    mesh = _mesh(slabs, like.region, like.temperature_K, like.range_V)
    return replace(mesh, bent_nm=like.bent_nm, waves=like.waves)


def growing_faces(length_nm: float, first_nm: float) -> FloatArray:
    """Faces from 0 to a length whose distances begin with a step and grow by `GROWTH`."""
    count = math.ceil(math.log1p(length_nm / first_nm * (GROWTH - 1.0)) / math.log(GROWTH))
    face = np.expm1(np.arange(count + 1) * math.log(GROWTH))
    return np.asarray(face * (length_nm / face[-1]))


def _buffer_nm(contact: Contact, where: str, temperature_K: float, drop_eV: float) -> float:
    """Length of contact that a voltage bends the band in: depleted, then screened."""
    density = contact_density_cm3(contact, where, temperature_K) * NM3_PER_CM3
    screening = screening_length_nm(contact, temperature_K)
    if not BUFFER_LENGTHS * screening < LONGEST_BUFFER_NM:
        allowed = "so few electrons cannot screen a field; raise the contact's donors_cm3"
        raise StructureError(where, "fermi_eV", contact.fermi_eV, allowed)
    depleted = math.sqrt(2.0 * _permittivity(contact.permittivity) * drop_eV / density)
    return min(BUFFER_LENGTHS * screening + depleted, LONGEST_BUFFER_NM)


def _contact_slab(
    contact: Contact, where: str, layer: int, face: FloatArray, temperature_K: float
) -> Slab:
    density = contact_density_cm3(contact, where, temperature_K) * NM3_PER_CM3
    edge, mass = (contact.edge_eV, contact.edge_eV), (contact.mass, contact.mass)
    ends = (float(face[0]), float(face[-1]))
    return Slab(layer, face, edge, mass, _permittivity(contact.permittivity), density, ends)


def _layer_slabs(structure: Structure, region: Region, step_nm: float) -> list[Slab]:
    faces = faces_nm(structure)
    slabs = []
    for number, layer in enumerate(structure.layers):
        start, end = faces[number], faces[number + 1]
        inside = not region.has_barrier and start < region.start_nm < end
        cuts = [start, region.start_nm, end] if inside else [start, end]
        still = layer.donors_cm3 == 0.0 and region.start_nm <= start and end <= region.end_nm
        parts = [
            np.linspace(a, b, 1 + (1 if still else math.ceil((b - a) / step_nm)))
            for a, b in itertools.pairwise(cuts)
        ]
        face = np.concatenate([parts[0], *(part[1:] for part in parts[1:])])
        slab = Slab(
            number,
            face,
            (layer.edge_eV, layer.right_edge_eV),
            (layer.mass, layer.right_mass),
            _permittivity(layer.permittivity),
            layer.donors_cm3 * NM3_PER_CM3,
            (start, end),
        )
        slabs.append(slab)
    return slabs


def _permittivity(stated: float | None) -> float:
    """In elementary charges per V and nm."""
    return EPS0_PER_V_NM * (ASSUMED_PERMITTIVITY if stated is None else stated)


def _mesh(
    slabs: list[Slab], region: Region, temperature_K: float, range_V: tuple[float, float]
) -> Mesh:
    count = [slab.face.size - 1 for slab in slabs]
    face = np.concatenate([[slabs[0].face[0]], *(slab.face[1:] for slab in slabs)])
    edge, mass = (
        np.concatenate([_along(slab, ends) for slab, ends in zip(slabs, pairs, strict=True)])
        for pairs in ([slab.edge for slab in slabs], [slab.mass for slab in slabs])
    )
    middle = 0.5 * (face[1:] + face[:-1])
    side = (middle > region.end_nm).astype(np.int64) - (middle < region.start_nm)
    return Mesh(
        face_nm=face,
        layer_index=np.repeat(np.array([slab.layer for slab in slabs]), count),
        edge_eV=edge,
        mass=mass,
        permittivity=np.repeat([slab.permittivity for slab in slabs], count),
        donors_nm3=np.repeat([slab.donors_nm3 for slab in slabs], count),
        side=side,
        region=region,
        temperature_K=temperature_K,
        range_V=range_V,
    )


def _along(slab: Slab, ends: tuple[float, float]) -> FloatArray:
    """Values at each element's nodes of what is linear over the slab, shape (E, 3)."""
    start, stop = slab.ends
    share = (with_middles(slab.face) - start) / (stop - start)
    share[0], share[-1] = 0.0, 1.0
    value = ends[0] * (1.0 - share) + ends[1] * share
    return np.stack([value[:-1:2], value[1::2], value[2::2]], axis=1)
