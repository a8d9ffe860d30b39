"""Screened fields over bias: solved where they are asked for, each from its nearest neighbour.

A curve asks for biases as it finds that it needs them. All are solved on one mesh, laid for the
whole range, so that what follows can be computed side by side.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from physics.band import Band
from physics.constants import ELEMENTARY_CHARGE_C
from physics.field import Profile, go_on
from physics.mesh import Mesh
from physics.meshing import mesh_of
from physics.poisson import ChargeModel, outward, screened_field
from physics.screening import Screened
from physics.structure import Structure

FloatArray = NDArray[np.float64]

CAPACITANCE_STEP_V = 2e-3
"""Half the step in bias over which a charge is differenced."""


@dataclass(frozen=True, eq=False)
class Solutions:
    """Solutions so far; asking for a bias adds to them."""

    structure: Structure
    temperature_K: float
    charge: ChargeModel
    band: Band
    mesh: Mesh
    watch: Callable[[], None] = go_on
    known: dict[float, Screened] = field(default_factory=dict)

    def at(self, bias_V: float) -> Screened:
        """Solve at a bias, or give the solution that is there."""
        if bias_V not in self.known:
            nearest = min(self.known, key=lambda other: abs(other - bias_V), default=None)
            self.known[bias_V] = screened_field(
                self.structure,
                bias_V,
                self.temperature_K,
                charge=self.charge,
                band=self.band,
                start=None if nearest is None else self.known[nearest],
                mesh=self.mesh,
                watch=self.watch,
            )
        return self.known[bias_V]

    def profiles(self, bias_V: FloatArray) -> list[Profile]:
        """Give the profiles at biases of shape (B,), solved outwards from the one nearest zero."""
        biases = bias_V.tolist()
        for index, _ in outward(biases):
            self.at(biases[index])
        return [replace(self.at(bias).profile, watch=self.watch) for bias in biases]

    def space_charge_F_per_cm2(self, bias_V: float) -> float:
        """Change of the electrons left of the tunnelling region with the bias."""
        low, high = self.mesh.range_V
        ends = (
            max(low, bias_V - CAPACITANCE_STEP_V),
            min(high, bias_V + CAPACITANCE_STEP_V),
        )
        first, last = (self.at(end).sheet_charge_left_cm2 for end in ends)
        return ELEMENTARY_CHARGE_C * abs(last - first) / (ends[1] - ends[0])


def solutions_over(
    structure: Structure,
    temperature_K: float,
    range_V: tuple[float, float],
    *,
    charge: ChargeModel = "semi-classical",
    band: Band = "parabolic",
    watch: Callable[[], None] = go_on,
) -> Solutions:
    """Begin with no solution, and a mesh that serves all biases of a range.

    Raises
    ------
    StructureError
        As `mesh_of`.
    """
    trial = np.linspace(*range_V, 3).tolist()
    mesh = mesh_of(structure, temperature_K, trial, waves=charge == "quantum", watch=watch)
    return Solutions(structure, temperature_K, charge, band, mesh, watch)
