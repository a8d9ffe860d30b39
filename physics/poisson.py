"""The screened field: donors and electrons bend the band edge (Poisson's equation).

``d/dx (eps dphi/dx) = -e (N_D - n)``, ``E_c = layer edge - phi``. Contacts are half-infinite, so
that a run of each of them, long enough for the band to be flat at its end, belongs to the domain.
Whatever is in equilibrium with a contact is filled to its Fermi level (`charge`); the mesh of a
sweep is laid once, for its whole range (`refine`), because what follows works on all biases at
once; `newton` solves.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Iterator, Sequence
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from physics.charge import fermi_levels_eV, thermal_electrons
from physics.errors import StructureError
from physics.field import built_in_eV, go_on
from physics.mesh import Mesh, first_mesh, screening_length_nm, with_middles
from physics.newton import MOST_STEPS, Relaxed, on_elements, relax
from physics.ranges import BIAS_V, TEMPERATURE_K
from physics.refine import halved, refined
from physics.screening import Screened, end_fields_V_per_nm, screened
from physics.structure import Structure

FloatArray = NDArray[np.float64]
ChargeModel = Literal["semi-classical", "quantum"]

TRIALS = 5
"""Biases of a range at which the charge is looked at before its mesh is laid."""
FLAT_V = 1e-5
"""Voltage left beyond a buffer's end, by its last slope, above which buffers are lengthened."""
LENGTHENED = (1.0, 2.0, 4.0)
RAMP_V = 0.1
"""Steps of bias by which a solution is led where a cold start does not arrive."""


def mesh_of(
    structure: Structure,
    temperature_K: float,
    biases_V: Iterable[float],
    *,
    charge: ChargeModel = "semi-classical",
    watch: Callable[[], None] = go_on,
) -> Mesh:
    """Lay the one mesh of a sweep.

    Buffers are lengthened until the band is flat at their ends for all biases; then the elements
    are made as long as the largest charge met in them allows.

    Raises
    ------
    StructureError
        A contact has no Fermi energy, or too few electrons to screen; a bias or the temperature is
        out of range.
    """
    biases = [float(bias) for bias in biases_V]
    _require_conditions(biases, temperature_K)
    range_V = (min(biases), max(biases))
    trials = np.unique(np.linspace(*range_V, TRIALS))
    for lengthened in LENGTHENED:
        mesh = first_mesh(structure, temperature_K, range_V, lengthened)
        most, left_over = np.zeros(mesh.permittivity.size), 0.0
        for bias in trials:
            fermi = fermi_levels_eV(structure, float(bias))
            electrons = thermal_electrons(mesh, fermi)
            relaxed = relax(mesh, electrons, _cold(structure, mesh, float(bias)), watch)
            net = mesh.donors_nm3[:, None] - electrons(on_elements(relaxed.potential_V))[0]
            most = np.maximum(most, np.abs(net).max(axis=1))
            left_over = max(left_over, _left_over_V(structure, mesh, relaxed.potential_V))
        if left_over <= FLAT_V:
            break
    return refined(mesh, most, waves=charge == "quantum")


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
    _require_conditions([bias_V], temperature_K)
    if (
        mesh is None
        and start is not None
        and start.mesh.range_V[0] <= bias_V <= (start.mesh.range_V[1])
    ):
        mesh = start.mesh
    if mesh is None:
        mesh = mesh_of(structure, temperature_K, [bias_V], charge=charge, watch=watch)
    electrons = thermal_electrons(mesh, fermi_levels_eV(structure, bias_V))
    guess = _cold(structure, mesh, bias_V) if start is None else _warm(mesh, start, bias_V)
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
    mesh = mesh_of(structure, temperature_K, biases_V, charge=charge, watch=watch)
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


def _require_conditions(biases_V: Sequence[float], temperature_K: float) -> None:
    for bias in biases_V:
        if not BIAS_V.holds(bias):
            raise StructureError("conditions", "bias_V", bias, BIAS_V.allowed)
    if not TEMPERATURE_K.holds(temperature_K):
        raise StructureError("conditions", "temperature_K", temperature_K, TEMPERATURE_K.allowed)


def _drop_share(mesh: Mesh) -> FloatArray:
    """Share of a voltage that has dropped at each node if it drops in the region alone."""
    inside = (mesh.layer_index >= 0) & (mesh.layer_index < mesh.layer_index[-1])
    if (mesh.side == 0).any():
        inside = mesh.side == 0
    weight = np.where(inside, mesh.step_nm / mesh.permittivity, 0.0)
    return with_middles(np.append(0.0, np.cumsum(weight) / weight.sum()))


def _cold(structure: Structure, mesh: Mesh, bias_V: float) -> FloatArray:
    """Potential to begin with where nothing is known."""
    return (bias_V + built_in_eV(structure)) * _drop_share(mesh)


def _warm(mesh: Mesh, start: Screened, bias_V: float) -> FloatArray:
    """Potential to begin with from a neighbour's."""
    known = np.interp(mesh.node_nm, start.profile.position_nm, start.potential_V)
    return known + (bias_V - start.bias_V) * _drop_share(mesh)


def _ramped(
    structure: Structure, mesh: Mesh, bias_V: float, watch: Callable[[], None], most_steps: int
) -> Relaxed:
    """Lead the solution from the bias at which nothing drops, in steps of `RAMP_V`."""
    flat = -built_in_eV(structure)
    count = max(1, math.ceil(abs(bias_V - flat) / RAMP_V))
    potential, share = _cold(structure, mesh, flat), _drop_share(mesh)
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


def _left_over_V(structure: Structure, mesh: Mesh, potential_V: FloatArray) -> float:
    """Voltage that the fields at the ends would still bend, were the buffers longer."""
    fields = end_fields_V_per_nm(mesh, potential_V)
    contacts = (structure.left, structure.right)
    return max(
        field * screening_length_nm(contact, mesh.temperature_K)
        for field, contact in zip(fields, contacts, strict=True)
    )


def _reason(relaxed: Relaxed) -> str:
    if relaxed.converged:
        return ""
    return (
        f"after {relaxed.steps} Newton steps the potential still moves by "
        f"{relaxed.last_step_V:.1e} V a step"
    )
