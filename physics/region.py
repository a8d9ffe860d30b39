"""Where electrons tunnel: what is neither the left contact's reservoir nor the right one's."""

from __future__ import annotations

import math
from dataclasses import dataclass

from physics.structure import Structure

BARRIER_EV = 0.025
"""A layer this far above the higher contact edge is a barrier: kT at room temperature; what is
lower lets most thermal electrons over it and keeps no two reservoirs apart."""


@dataclass(frozen=True)
class Region:
    """The tunnelling region; to its left the left Fermi level rules, to its right the right one."""

    start_nm: float
    end_nm: float
    """Equal to ``start_nm`` where there is no barrier: the quasi-Fermi level steps there."""
    has_barrier: bool

    def says(self) -> str:
        """Say in words where the Fermi levels part."""
        if self.has_barrier:
            return (
                "equilibrium with the left contact up to "
                f"{self.start_nm:.4g} nm and with the right one from {self.end_nm:.4g} nm on"
            )
        return (
            "no barrier, so the quasi-Fermi level steps at one point, "
            f"{self.start_nm:.4g} nm, where the unbiased edge is highest"
        )


def faces_nm(structure: Structure) -> list[float]:
    """Give the layers' faces, one more than layers, the left contact's face at 0."""
    faces = [0.0]
    for layer in structure.layers:
        faces.append(faces[-1] + layer.thickness_nm)
    return faces


def tunnelling_region(structure: Structure) -> Region:
    """Find the first and the last barrier, or else the point where the unbiased edge is highest.

    A barrier is a layer whose unbiased edge rises by more than `BARRIER_EV` above the higher
    contact edge. Where all layers are as high as each other the point is the stack's middle.
    """
    faces = faces_nm(structure)
    tops = [max(layer.edge_eV, layer.right_edge_eV) for layer in structure.layers]
    floor = max(structure.left.edge_eV, structure.right.edge_eV)
    barriers = [n for n, top in enumerate(tops) if top > floor + BARRIER_EV]
    if barriers:
        return Region(faces[barriers[0]], faces[barriers[-1] + 1], has_barrier=True)
    bottoms = [min(layer.edge_eV, layer.right_edge_eV) for layer in structure.layers]
    if math.isclose(max(tops), min(bottoms), abs_tol=1e-12):
        middle = 0.5 * faces[-1]
    else:
        highest = tops.index(max(tops))
        middle = 0.5 * (faces[highest] + faces[highest + 1])
    return Region(middle, middle, has_barrier=False)
