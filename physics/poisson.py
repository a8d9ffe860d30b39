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
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from physics.band import Band
from physics.charge import Electrons, fermi_levels_eV, thermal_electrons
from physics.constants import BOLTZMANN_EV_PER_K
from physics.field import built_in_eV, go_on
from physics.mesh import Mesh, with_middles
from physics.meshing import cold_start_V, drop_share, mesh_of, require_conditions
from physics.newton import MOST_STEPS, Relaxed, relax
from physics.refine import halved
from physics.screening import Screened, bent_profile, screened
from physics.structure import Structure
from physics.waves import Waves, split_waves, wave_electrons, waves_of

FloatArray = NDArray[np.float64]
ChargeModel = Literal["semi-classical", "quantum"]

MOST_ROUNDS = 40
MOVED_V, MOVED_KT = 5e-7, 1e-4
"""Change of the potential, and of it over kT, from which the waves' next one is far below what
levels and their filling notice."""
NEAR_V = 3e-3
"""Change of the potential up to which levels are followed rather than found anew."""
DEPTH = 3
"""Earlier rounds that the next one's start is drawn from."""
RAMP_V = 0.1
"""Steps of bias by which a solution is led where a cold start does not arrive."""


def screened_field(
    structure: Structure,
    bias_V: float,
    temperature_K: float,
    *,
    charge: ChargeModel = "semi-classical",
    band: Band = "parabolic",
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
    band : str
        The masses of waves and profile; semi-classical electrons keep those of the band edge.
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
    quantum = charge == "quantum"
    if mesh is None and start is not None and _serves(start.mesh, bias_V, temperature_K, quantum):
        mesh = start.mesh
    if mesh is None:
        mesh = mesh_of(structure, temperature_K, [bias_V], waves=quantum, watch=watch)
    case = _Case(structure, mesh, bias_V, most_steps, watch, band)
    answer = _semi_classical(case, start)
    if quantum and not mesh.region.has_barrier:
        answer = replace(answer, words=(*answer.words, "no region whose electrons could be waves"))
    elif quantum and answer.relaxed.converged:
        quantum_start = start if start is not None and start.mesh.waves else None
        guess = _warm(case, quantum_start) if quantum_start else answer.relaxed.potential_V
        answer = _with_waves(case, guess)
    return screened(
        structure,
        mesh,
        bias_V,
        answer.electrons,
        answer.relaxed,
        model="; ".join([*answer.words, mesh.region.says()]),
        reason=answer.reason,
        mesh_error_eV=_mesh_error_eV(case, answer),
        band=band,
    )


def screened_sweep(
    structure: Structure,
    biases_V: Sequence[float],
    temperature_K: float,
    *,
    charge: ChargeModel = "semi-classical",
    band: Band = "parabolic",
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
            band=band,
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


@dataclass(frozen=True, eq=False)
class _Case:
    """What is to be solved."""

    structure: Structure
    mesh: Mesh
    bias_V: float
    most_steps: int
    watch: Callable[[], None]
    band: Band

    @property
    def fermi_eV(self) -> tuple[float, float]:
        return fermi_levels_eV(self.structure, self.bias_V)

    def relax(self, electrons: Electrons, start_V: FloatArray) -> Relaxed:
        return relax(self.mesh, electrons, start_V, self.watch, self.most_steps)


@dataclass(frozen=True, eq=False)
class _Answer:
    """Where it led."""

    relaxed: Relaxed
    electrons: Electrons
    words: tuple[str, ...]
    reason: str
    waves: Waves | None = None


def _serves(mesh: Mesh, bias_V: float, temperature_K: float, quantum: bool) -> bool:
    low, high = mesh.range_V
    return low <= bias_V <= high and mesh.temperature_K == temperature_K and mesh.waves >= quantum


def _semi_classical(case: _Case, start: Screened | None) -> _Answer:
    electrons = thermal_electrons(case.mesh, case.fermi_eV)
    if start is None:
        guess = cold_start_V(case.structure, case.mesh, case.bias_V)
    else:
        guess = _warm(case, start)
    relaxed = case.relax(electrons, guess)
    if not relaxed.converged:
        relaxed = _ramped(case)
    return _Answer(relaxed, electrons, ("semi-classical electrons",), _reason(relaxed))


def _warm(case: _Case, start: Screened) -> FloatArray:
    """Potential to begin with from a neighbour's."""
    known = np.interp(case.mesh.node_nm, start.mesh.node_nm, start.whole_V)
    return known + (case.bias_V - start.bias_V) * drop_share(case.mesh)


def _ramped(case: _Case) -> Relaxed:
    """Lead the solution from the bias at which nothing drops, in steps of `RAMP_V`."""
    flat = -built_in_eV(case.structure)
    count = max(1, math.ceil(abs(case.bias_V - flat) / RAMP_V))
    share = drop_share(case.mesh)
    potential = cold_start_V(case.structure, case.mesh, flat)
    for bias in np.linspace(flat, case.bias_V, count + 1)[:-1]:
        fermi = fermi_levels_eV(case.structure, float(bias))
        potential = case.relax(thermal_electrons(case.mesh, fermi), potential).potential_V
        potential = potential + (case.bias_V - flat) / count * share
    return case.relax(thermal_electrons(case.mesh, case.fermi_eV), potential)


def _with_waves(case: _Case, start_V: FloatArray) -> _Answer:
    """Let the waves and the potential agree, round by round."""
    outside = thermal_electrons(case.mesh, case.fermi_eV)
    potential, steps, last_moved = start_V, 0, math.inf
    waves: Waves | None = None
    tried: list[FloatArray] = []
    led_to: list[FloatArray] = []
    settled = min(MOVED_V, MOVED_KT * BOLTZMANN_EV_PER_K * case.mesh.temperature_K)
    for _ in range(MOST_ROUNDS):
        profile = bent_profile(case.structure, case.mesh, case.bias_V, potential, case.band)
        profile = replace(profile, watch=case.watch)
        near = waves if last_moved <= NEAR_V else None
        waves = waves_of(case.mesh, profile, potential, case.fermi_eV, near)
        electrons = wave_electrons(case.mesh, waves, outside, case.fermi_eV)
        relaxed = case.relax(electrons, potential)
        steps += relaxed.steps
        moved = float(np.abs(relaxed.potential_V - potential).max())
        # The residual that counts is the one before the waves were moved along.
        relaxed = replace(relaxed, steps=steps, residual=relaxed.first_residual)
        words = ("electrons between the barriers as waves of both contacts", *waves.remarks)
        if moved <= settled and relaxed.converged:
            return _Answer(relaxed, electrons, words, "", waves)
        if moved > last_moved:
            tried, led_to = [], []
        tried, led_to = [*tried[-DEPTH:], potential], [*led_to[-DEPTH:], relaxed.potential_V]
        potential, last_moved = _mixed(tried, led_to), moved
    relaxed = replace(relaxed, converged=False)
    reason = f"after {MOST_ROUNDS} rounds the waves still move the potential by {moved:.1e} V"
    return _Answer(relaxed, electrons, words, reason, waves)


def _mixed(tried: list[FloatArray], led_to: list[FloatArray]) -> FloatArray:
    """Start of the next round: where the changes of the last ones would cancel best.

    D. G. Anderson, J. ACM 12, 547 (1965), from memory. After a round that made it worse they are
    forgotten.
    """
    change = led_to[-1] - tried[-1]
    if len(tried) == 1:
        return led_to[-1]
    changes = np.stack([change - (b - a) for a, b in zip(tried, led_to, strict=True)][:-1], axis=1)
    ways = np.stack([led_to[-1] - b for b in led_to[:-1]], axis=1)
    share = np.linalg.lstsq(changes, change, rcond=1e-6)[0]
    return np.asarray(led_to[-1] - ways @ share)


def _mesh_error_eV(case: _Case, answer: _Answer) -> float:
    """Compare with all steps halved, at the nodes and in the middle of the pieces.

    Waves are kept; what they would change in a potential as finely drawn is not seen.
    """
    if not answer.relaxed.converged:
        return math.nan
    fine = halved(case.mesh)
    electrons = thermal_electrons(fine, case.fermi_eV)
    if answer.waves is not None:
        electrons = wave_electrons(fine, split_waves(answer.waves), electrons, case.fermi_eV)
    coarse = with_middles(answer.relaxed.potential_V)
    found = relax(fine, electrons, coarse, case.watch)
    return float(np.abs(found.potential_V - coarse).max()) if found.converged else math.nan


def _reason(relaxed: Relaxed) -> str:
    if relaxed.converged:
        return ""
    return (
        f"after {relaxed.steps} Newton steps the potential still moves by "
        f"{relaxed.last_step_V:.1e} V a step"
    )
