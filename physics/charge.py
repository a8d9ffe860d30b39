"""Electrons in equilibrium with a contact, at given bending of the band."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from physics.constants import BOLTZMANN_EV_PER_K
from physics.field import built_in_eV
from physics.mesh import NM3_PER_CM3, Mesh
from physics.occupation import band_density_cm3, fermi_dirac_half
from physics.structure import Structure

FloatArray = NDArray[np.float64]

Electrons = Callable[[FloatArray], tuple[FloatArray, FloatArray]]
"""From the potential at the elements' nodes in V, (E, 3), to the electrons there in nm^-3 and
their slope per V, each (E, 3)."""


def fermi_levels_eV(structure: Structure, bias_V: float) -> tuple[float, float]:
    """Fermi level of the left and of the right contact on the profile's scale."""
    left, right = structure.left, structure.right
    drop = bias_V + built_in_eV(structure)
    return left.edge_eV + (left.fermi_eV or 0.0), right.edge_eV - drop + (right.fermi_eV or 0.0)


def thermal_electrons(mesh: Mesh, fermi_eV: tuple[float, float]) -> Electrons:
    """Electrons outside the tunnelling region, each side filled to its contact's Fermi level.

    ``n = Nc 2 / sqrt(pi) F((mu - E_c) / kT)`` (S. M. Sze, Physics of Semiconductor Devices, 2nd
    ed. (1981), sec. 1.4, from memory); none inside the region.
    """
    kT = BOLTZMANN_EV_PER_K * mesh.temperature_K
    filled = mesh.side != 0
    level = np.where(mesh.side < 0, *fermi_eV)[filled, None]
    edge = mesh.edge_eV[filled]
    per_mass = band_density_cm3(1.0, mesh.temperature_K) * NM3_PER_CM3
    density = per_mass * mesh.mass[filled] ** 1.5 * (2.0 / math.sqrt(math.pi))

    def electrons(potential_V: FloatArray) -> tuple[FloatArray, FloatArray]:
        value, slope = fermi_dirac_half((level - edge + potential_V[filled]) / kT)
        count, rate = np.zeros_like(potential_V), np.zeros_like(potential_V)
        count[filled], rate[filled] = density * value, density * slope / kT
        return count, rate

    return electrons
