"""The screened field: donors and electrons bend the band edge (Poisson's equation).

``d/dx (eps dphi/dx) = -e (N_D - n)``, ``E_c = layer edge - phi``. Contacts are half-infinite, so
that a run of each of them, long enough for the band to be flat at its end, belongs to the domain.
Whatever is in equilibrium with a contact is filled to its Fermi level (`charge`); the mesh of a
sweep is laid once, for its whole range (`refine`), because what follows works on all biases at
once; `newton` solves.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Sequence
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from physics.charge import fermi_levels_eV, thermal_electrons
from physics.field import built_in_eV, go_on
from physics.mesh import Mesh, with_middles
from physics.meshing import cold_start_V, drop_share, mesh_of, require_conditions
from physics.newton import MOST_STEPS, Relaxed, relax
from physics.refine import halved
from physics.screening import Screened, screened
from physics.structure import Structure

FloatArray = NDArray[np.float64]
ChargeModel = Literal["semi-classical", "quantum"]

RAMP_V = 0.1
"""Steps of bias by which a solution is led where a cold start does not arrive."""


def screened_field(
    structure: Structure,
    bias_V: float,
    temperature_K: float,
    *,
    charge: ChargeModel = "semi-classical",
    start: Screened | None = None,
    mesh: Mesh | None = None,
    most_steps: int = MOST_STEPS,
    watch: Callable[[], None] = go_on,
) -> Screened:
    """Bend a structure's band edge by the charge on it.

    Parameters
    ----------
    structure : Structure
        Both contacts with a Fermi energy.
    bias_V : float
        Right contact relative to the left; positive lowers the right contact's band edge.
    temperature_K : float
        Temperature of lattice and carriers.
    charge : str
        The electrons of the tunnelling region: none, or those of its waves.
    start : Screened, optional
        The solution at a neighbouring bias; its mesh is taken if it was made for this bias too.
    mesh : Mesh, optional
        As `mesh_of` laid it for a range with this bias.
    most_steps : int
        Newton steps after which it is given up.
    watch : callable
        Called again and again; by raising it ends the work.

    Raises
    ------
    StructureError
        As `mesh_of`. A solution that does not converge is returned and says so.
    """
    require_conditions([bias_V], temperature_K)
    if (
        mesh is None
        and start is not None
        and start.mesh.range_V[0] <= bias_V <= (start.mesh.range_V[1])
    ):
        mesh = start.mesh
    if mesh is None:
        mesh = mesh_of(structure, temperature_K, [bias_V], waves=charge == "quantum", watch=watch)
    electrons = thermal_electrons(mesh, fermi_levels_eV(structure, bias_V))
    guess = cold_start_V(structure, mesh, bias_V) if start is None else _warm(mesh, start, bias_V)
    relaxed = relax(mesh, electrons, guess, watch, most_steps)
    if not relaxed.converged and start is None:
        relaxed = _ramped(structure, mesh, bias_V, watch, most_steps)
    error = np.nan
    if relaxed.converged:
        error = _mesh_error_eV(structure, mesh, bias_V, relaxed.potential_V, watch)
    return screened(
        structure,
        mesh,
        bias_V,
        electrons,
        relaxed,
        model="semi-classical electrons, " + mesh.region.says(),
        reason=_reason(relaxed),
        mesh_error_eV=error,
    )


def screened_sweep(
    structure: Structure,
    biases_V: Sequence[float],
    temperature_K: float,
    *,
    charge: ChargeModel = "semi-classical",
    watch: Callable[[], None] = go_on,
) -> tuple[Screened, ...]:
    """Solve for many biases on one mesh, from the one nearest zero outwards.

    Returns
    -------
    tuple of Screened
        In the order of ``biases_V``; all profiles have the same pieces.

    Raises
    ------
    StructureError
        As `mesh_of`.
    """
    mesh = mesh_of(structure, temperature_K, biases_V, waves=charge == "quantum", watch=watch)
    done: dict[int, Screened] = {}
    for index, before in outward(biases_V):
        done[index] = screened_field(
            structure,
            biases_V[index],
            temperature_K,
            charge=charge,
            start=None if before is None else done[before],
            mesh=mesh,
            watch=watch,
        )
    return tuple(done[index] for index in range(len(biases_V)))


def outward(biases_V: Sequence[float]) -> Iterator[tuple[int, int | None]]:
    """Give every index with that of its neighbour solved before, from the bias nearest zero on."""
    order = sorted(range(len(biases_V)), key=lambda index: biases_V[index])
    first = min(range(len(order)), key=lambda rank: abs(biases_V[order[rank]]))
    yield order[first], None
    for rank in range(first + 1, len(order)):
        yield order[rank], order[rank - 1]
    for rank in range(first - 1, -1, -1):
        yield order[rank], order[rank + 1]


def _warm(mesh: Mesh, start: Screened, bias_V: float) -> FloatArray:
    """Potential to begin with from a neighbour's."""
    known = np.interp(mesh.node_nm, start.mesh.node_nm, start.whole_V)
    return known + (bias_V - start.bias_V) * drop_share(mesh)


def _ramped(
    structure: Structure, mesh: Mesh, bias_V: float, watch: Callable[[], None], most_steps: int
) -> Relaxed:
    """Lead the solution from the bias at which nothing drops, in steps of `RAMP_V`."""
    flat = -built_in_eV(structure)
    count = max(1, math.ceil(abs(bias_V - flat) / RAMP_V))
    potential, share = cold_start_V(structure, mesh, flat), drop_share(mesh)
    for bias in np.linspace(flat, bias_V, count + 1)[:-1]:
        electrons = thermal_electrons(mesh, fermi_levels_eV(structure, float(bias)))
        relaxed = relax(mesh, electrons, potential, watch, most_steps)
        potential = relaxed.potential_V + (bias_V - flat) / count * share
    electrons = thermal_electrons(mesh, fermi_levels_eV(structure, bias_V))
    return relax(mesh, electrons, potential, watch, most_steps)


def _mesh_error_eV(
    structure: Structure,
    mesh: Mesh,
    bias_V: float,
    potential_V: FloatArray,
    watch: Callable[[], None],
) -> float:
    """Compare with all steps halved, at the nodes and in the middle of the pieces."""
    fine = halved(mesh)
    electrons = thermal_electrons(fine, fermi_levels_eV(structure, bias_V))
    found = relax(fine, electrons, with_middles(potential_V), watch)
    if not found.converged:
        return math.nan
    return float(np.abs(found.potential_V - with_middles(potential_V)).max())


def _reason(relaxed: Relaxed) -> str:
    if relaxed.converged:
        return ""
    return (
        f"after {relaxed.steps} Newton steps the potential still moves by "
        f"{relaxed.last_step_V:.1e} V a step"
    )
