"""Closed forms evaluated at 50 digits with mpmath; formula and source stand beside each case.

The table `exact_cases.json` names for every case the formula and the textbook or paper it is from.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from physics.constants import HBAR2_OVER_2M0_EV_NM2
from physics.field import Profile, uniform_field
from physics.levels import find_levels
from physics.scattering import scatter
from reference.stacks import stack

TABLE = json.loads((Path(__file__).parent / "exact_cases.json").read_text(encoding="utf-8"))
CASES: list[dict[str, Any]] = TABLE["cases"]


def cases(*names: str) -> list[Any]:
    chosen = [case for case in CASES if case["case"] in names]
    assert chosen
    return [
        pytest.param(numbers(c["inputs"]), c["result"], id=f"{c['case']} {n}")
        for n, c in enumerate(chosen)
    ]


def numbers(inputs: dict[str, Any]) -> dict[str, Any]:
    return {
        key: [float(v) for v in value] if isinstance(value, list) else float(value)
        for key, value in inputs.items()
    }


def transmission(profile: Profile, energy: float) -> tuple[float, float]:
    result = scatter(profile, np.array([energy]))
    return float(result.transmission[0]), float(result.reflection[0])


def test_every_case_of_the_table_is_tried() -> None:
    tried = {
        "rectangular barrier, one mass",
        "rectangular barrier, barrier mass differs",
        "full transmission above a barrier",
        "half-wave layer between unlike outer regions",
        "step",
        "sech^2 barrier",
        "smooth step",
        "tilted rectangular barrier, Airy functions",
        "finite square well, energies from the well bottom",
        "N periods of well + barrier between well-like contacts",
        "miniband edges",
        "two-barrier poles",
    }
    assert {case["case"] for case in CASES} == tried


def test_constant() -> None:
    stated = float(TABLE["constants"]["hbar2_over_2m0_eV_nm2"])
    assert pytest.approx(stated, rel=1e-15) == HBAR2_OVER_2M0_EV_NM2


@pytest.mark.parametrize(
    ("i", "result"),
    cases("rectangular barrier, one mass", "rectangular barrier, barrier mass differs"),
)
def test_rectangular_barrier(i: dict[str, float], result: dict[str, str]) -> None:
    outside, inside = i.get("mass_outside", i.get("mass")), i.get("mass_barrier", i.get("mass"))
    structure = stack([(i["d_nm"], i["V_eV"], inside)], (0.0, outside), (0.0, outside))
    t, r = transmission(uniform_field(structure), i["E_eV"])
    assert t == pytest.approx(float(result["transmission"]), rel=1e-13)
    assert t + r == pytest.approx(1.0, abs=1e-14)


@pytest.mark.parametrize(
    ("i", "result"),
    cases("full transmission above a barrier", "half-wave layer between unlike outer regions"),
)
def test_half_wave_layer(i: dict[str, float], result: dict[str, str]) -> None:
    mass = i["mass"]
    structure = stack(
        [(i["d_nm"], i["V_eV"], mass)], (0.0, mass), (i.get("right_edge_eV", 0.0), mass)
    )
    energy = float(result.get("E_eV", i.get("E_eV", 0.0)))
    t, _ = transmission(uniform_field(structure), energy)
    assert t == pytest.approx(float(result["transmission"]), rel=1e-13)


@pytest.mark.parametrize(("i", "result"), cases("step"))
def test_step(i: dict[str, float], result: dict[str, str]) -> None:
    # A stack has at least one layer: one like the right contact leaves the step as it is.
    structure = stack(
        [(1.0, i["V_eV"], i["mass_right"])],
        (0.0, i["mass_left"]),
        (i["V_eV"], i["mass_right"]),
    )
    t, _ = transmission(uniform_field(structure), i["E_eV"])
    assert t == pytest.approx(float(result["transmission"]), rel=1e-13)


def curved(edge: Any, half_length: float, mass: float, pieces: int) -> Profile:
    """A smooth edge as linear pieces whose faces lie on it."""
    x = np.linspace(-half_length, half_length, pieces + 1)
    v = edge(x)
    masses = np.full(pieces, mass)
    return Profile(
        position_nm=x + half_length,
        thickness_nm=np.diff(x),
        edge_left_eV=v[:-1],
        edge_right_eV=v[1:],
        mass_left=masses,
        mass_right=masses,
        layer_index=np.zeros(pieces, dtype=np.int64),
        contact_edge_eV=(float(v[0]), float(v[-1])),
        contact_mass=(mass, mass),
    )


def extrapolated(edge: Any, half_length: float, mass: float, energy: float) -> float:
    """T on 3,000 and 6,000 pieces, the error of second order taken off (Richardson)."""
    coarse, fine = (
        transmission(curved(edge, half_length, mass, pieces), energy)[0] for pieces in (3000, 6000)
    )
    return fine + (fine - coarse) / 3.0


@pytest.mark.parametrize(("i", "result"), cases("sech^2 barrier"))
def test_sech2_barrier(i: dict[str, float], result: dict[str, str]) -> None:
    def edge(x: Any) -> Any:
        return i["V_eV"] / np.cosh(x / i["a_nm"]) ** 2

    t = extrapolated(edge, 13.0 * i["a_nm"], i["mass"], i["E_eV"])
    assert t == pytest.approx(float(result["transmission"]), rel=1e-8)


@pytest.mark.parametrize(("i", "result"), cases("smooth step"))
def test_smooth_step(i: dict[str, float], result: dict[str, str]) -> None:
    def edge(x: Any) -> Any:
        return i["V_eV"] / (1.0 + np.exp(-x / i["a_nm"]))

    t = extrapolated(edge, 30.0 * i["a_nm"], i["mass"], i["E_eV"])
    assert t == pytest.approx(float(result["transmission"]), rel=1e-8)


@pytest.mark.parametrize(("i", "result"), cases("tilted rectangular barrier, Airy functions"))
def test_tilted_barrier(i: dict[str, float], result: dict[str, str]) -> None:
    outside = i["mass_outside"]
    structure = stack([(i["d_nm"], i["V_eV"], i["mass_barrier"])], (0.0, outside), (0.0, outside))
    profile = uniform_field(structure, i["field_V_per_nm"] * i["d_nm"])
    t, _ = transmission(profile, i["E_eV"])
    assert t == pytest.approx(float(result["transmission"]), rel=1e-12)


@pytest.mark.parametrize(
    ("i", "result"), cases("finite square well, energies from the well bottom")
)
def test_finite_well(i: dict[str, float], result: dict[str, Any]) -> None:
    outside = (i["depth_eV"], i["mass_barrier"])
    structure = stack([(i["width_nm"], 0.0, i["mass_well"])], outside, outside)
    found = find_levels(uniform_field(structure), 0.0, i["depth_eV"])
    expected = [float(energy) for energy in result["levels_eV"]]
    assert [level.energy_eV for level in found.levels] == pytest.approx(expected, abs=1e-15)
    assert [level.nodes for level in found.levels] == list(range(len(expected)))
    assert {level.kind for level in found.levels} == {"bound"}
    assert found.complete
    assert found.counted == len(expected)


def superlattice(i: dict[str, float], periods: int) -> Profile:
    period = [(i["well_nm"], 0.0, i["mass_well"]), (i["barrier_nm"], i["V_eV"], i["mass_barrier"])]
    contact = (0.0, i["mass_well"])
    return uniform_field(stack(period * periods, contact, contact))


@pytest.mark.parametrize(
    ("i", "result"), cases("N periods of well + barrier between well-like contacts")
)
def test_superlattice(i: dict[str, float], result: dict[str, str]) -> None:
    t, _ = transmission(superlattice(i, int(i["N"])), i["E_eV"])
    assert t == pytest.approx(float(result["transmission"]), rel=1e-12)


@pytest.mark.parametrize(("i", "result"), cases("miniband edges"))
def test_miniband_edges(i: dict[str, float], result: dict[str, Any]) -> None:
    """Every level of 24 periods below the second gap lies in a Kronig-Penney band."""
    edges = [float(edge) for edge in result["edges_eV"]]
    found = find_levels(superlattice(i, 24), edges[0] - 0.05, edges[2] - 1e-3, 0.05)
    energies = np.array([level.energy_eV for level in found.levels])
    assert found.complete
    assert energies.size == 23  # N periods between well-like contacts: N - 1 wells
    assert energies.min() > edges[0]
    assert energies.max() < edges[1]
    assert energies.min() - edges[0] < 0.02 * (edges[1] - edges[0])
    assert edges[1] - energies.max() < 0.02 * (edges[1] - edges[0])


@pytest.mark.parametrize(("i", "result"), cases("two-barrier poles"))
def test_two_barrier_poles(i: dict[str, Any], result: dict[str, Any]) -> None:
    first, second = i["barriers_nm"]
    barrier, contact = (i["V_eV"], i["mass_barrier"]), (0.0, i["mass_well"])
    layers = [(first, *barrier), (i["well_nm"], *contact), (second, *barrier)]
    profile = uniform_field(stack(layers, contact, contact), i["bias_V"])
    found = find_levels(profile, 0.0, i["V_eV"], 0.05)
    expected = result["levels"]
    assert found.complete
    assert len(found.levels) == len(expected)
    for level, exact in zip(found.levels, expected, strict=True):
        assert level.energy_eV == pytest.approx(float(exact["energy_eV"]), abs=1e-14)
        assert level.width_eV == pytest.approx(float(exact["width_eV"]), rel=1e-12)
