"""The one mesh of a sweep, laid after a look at the charge over its whole range of bias."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from physics.charge import fermi_levels_eV, thermal_electrons
from physics.constants import BOLTZMANN_EV_PER_K
from physics.errors import StructureError
from physics.field import built_in_eV, go_on
from physics.mesh import CHORD_EV, Mesh, first_mesh, screening_length_nm, with_middles
from physics.newton import on_elements, relax
from physics.occupation import fermi_dirac_half
from physics.ranges import BIAS_V, TEMPERATURE_K
from physics.refine import refined
from physics.screening import end_fields_V_per_nm
from physics.structure import Contact, Structure

FloatArray = NDArray[np.float64]

TRIALS = 5
"""Biases of a range at which the charge is looked at before its mesh is laid."""
LEFT_OVER_V = 1e-5
"""Voltage left beyond a buffer's end, by its last slope, above which buffers are lengthened."""
LENGTHS_PER_ELEMENT = 0.8
"""Longest element of a contact in its screening lengths; a parabola follows that to 1e-3."""
LENGTHENED = (1.0, 2.0, 4.0)
FLAT_SHARE = 0.01
"""Bending below this share of what the contact's electrons measure energies by (kT, or 2/3 of a
Fermi energy), and below `CHORD_EV`, is none to a wave."""


@dataclass(frozen=True, eq=False)
class _Seen:
    """What the trials showed in each element of a first mesh."""

    charge_nm3: FloatArray
    """Largest net charge, shape (E,)."""
    is_bent: NDArray[np.bool_]
    """Whether the band is bent there, or it is layer; shape (E,)."""
    limit_nm: FloatArray
    """Longest element that follows the fading of the potential, shape (E,)."""
    left_over_V: float


def mesh_of(
    structure: Structure,
    temperature_K: float,
    biases_V: Iterable[float],
    *,
    waves: bool = False,
    watch: Callable[[], None] = go_on,
) -> Mesh:
    """Lay the mesh that serves all biases of a sweep.

    Buffers are lengthened until the band is flat at their ends for all of them; then the elements
    are made as long as the largest charge met in them allows.

    Parameters
    ----------
    structure : Structure
        Both contacts with a Fermi energy.
    temperature_K : float
        Temperature of lattice and carriers.
    biases_V : iterable of float
        The biases; only the lowest and the highest matter.
    waves : bool
        Whether electrons in the tunnelling region will be waves.
    watch : callable
        Called again and again; by raising it ends the work.

    Raises
    ------
    StructureError
        A contact has no Fermi energy, or too few electrons to screen; a bias or the temperature is
        out of range.
    """
    biases = [float(bias) for bias in biases_V]
    require_conditions(biases, temperature_K)
    range_V = (min(biases), max(biases))
    for lengthened in LENGTHENED:
        mesh = first_mesh(structure, temperature_K, range_V, lengthened)
        seen = _looked_at(structure, mesh, watch)
        if seen.left_over_V <= LEFT_OVER_V:
            break
    bent = np.flatnonzero(seen.is_bent)
    ends = (float(mesh.face_nm[bent[0]]), float(mesh.face_nm[bent[-1] + 1]))
    return refined(replace(mesh, bent_nm=ends), seen.charge_nm3, seen.limit_nm, waves=waves)


def require_conditions(biases_V: Sequence[float], temperature_K: float) -> None:
    """Raise `StructureError` where a bias or the temperature is out of range."""
    for bias in biases_V:
        if not BIAS_V.holds(bias):
            raise StructureError("conditions", "bias_V", bias, BIAS_V.allowed)
    if not TEMPERATURE_K.holds(temperature_K):
        raise StructureError("conditions", "temperature_K", temperature_K, TEMPERATURE_K.allowed)


def drop_share(mesh: Mesh) -> FloatArray:
    """Share of a voltage that has dropped at each node if none drops in a reservoir, (2 E + 1,)."""
    inside = mesh.side == 0
    if not inside.any():
        inside = (mesh.layer_index >= 0) & (mesh.layer_index < mesh.layer_index[-1])
    weight = np.where(inside, mesh.step_nm / mesh.permittivity, 0.0)
    return with_middles(np.append(0.0, np.cumsum(weight) / weight.sum()))


def cold_start_V(structure: Structure, mesh: Mesh, bias_V: float) -> FloatArray:
    """Potential to begin with where nothing is known, shape (2 E + 1,)."""
    return (bias_V + built_in_eV(structure)) * drop_share(mesh)


def _looked_at(structure: Structure, mesh: Mesh, watch: Callable[[], None]) -> _Seen:
    size, last = mesh.permittivity.size, mesh.layer_index[-1]
    in_contact = (mesh.layer_index < 0, mesh.layer_index == last)
    bent = ~(in_contact[0] | in_contact[1])
    # At least one element of either contact is always part of the profile.
    bent[np.flatnonzero(in_contact[0])[-1]] = bent[np.flatnonzero(in_contact[1])[0]] = True
    contacts = (structure.left, structure.right)
    flat_V = [_flat_V(contact, mesh.temperature_K) for contact in contacts]
    lengths = [screening_length_nm(contact, mesh.temperature_K) for contact in contacts]
    limit = np.full(size, np.inf)
    for side in (0, 1):
        limit[in_contact[side]] = LENGTHS_PER_ELEMENT * lengths[side]
    charge, left_over = np.zeros(size), 0.0
    for bias in np.unique(np.linspace(*mesh.range_V, TRIALS)):
        electrons = thermal_electrons(mesh, fermi_levels_eV(structure, float(bias)))
        start = cold_start_V(structure, mesh, float(bias))
        potential = relax(mesh, electrons, start, watch).potential_V
        element = on_elements(potential)
        net = mesh.donors_nm3[:, None] - electrons(element)[0]
        charge = np.maximum(charge, np.abs(net).max(axis=1))
        fields = end_fields_V_per_nm(mesh, potential)
        for side in (0, 1):
            away = np.abs(element - potential[-side]).max(axis=1)
            bent |= in_contact[side] & (away > flat_V[side])
            left_over = max(left_over, fields[side] * lengths[side])
    return _Seen(charge, bent, limit, left_over)


def _flat_V(contact: Contact, temperature_K: float) -> float:
    kT = BOLTZMANN_EV_PER_K * temperature_K
    value, slope = fermi_dirac_half((contact.fermi_eV or 0.0) / kT)
    return min(CHORD_EV, FLAT_SHARE * kT * float(value) / max(float(slope), math.ulp(0.0)))
