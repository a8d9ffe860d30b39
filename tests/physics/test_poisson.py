"""The screened field, held against screening lengths, another solver and its own symmetries."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import solve_bvp

from physics.charge import fermi_levels_eV, thermal_electrons
from physics.constants import BOLTZMANN_EV_PER_K
from physics.errors import StructureError
from physics.field import uniform_field
from physics.levels import find_levels
from physics.mesh import EPS0_PER_V_NM, first_mesh
from physics.meshing import mesh_of
from physics.newton import relax
from physics.occupation import fermi_dirac_half, fermi_from_donors
from physics.poisson import Screened, outward, screened_field, screened_sweep
from physics.region import tunnelling_region
from physics.scattering import scatter
from physics.structure import Contact, Layer, Structure

MASS, EPS = 0.067, 12.9


def contact(donors: float, temperature: float, edge: float = 0.0) -> Contact:
    fermi = fermi_from_donors(donors, MASS, temperature)
    return Contact(edge, MASS, fermi, donors_cm3=donors, permittivity=EPS)


def flat(donors: float, thickness: float = 60.0) -> Layer:
    return Layer(thickness, 0.0, MASS, donors_cm3=donors, permittivity=EPS)


def two_barriers(
    temperature: float = 300.0, donors: float = 1e18, spacer: float = 1e17, height: float = 0.3
) -> Structure:
    """60 nm, mirror-symmetric, of doped spacers, undoped ones, and barriers."""
    end = contact(donors, temperature)
    half = (flat(spacer, 18.0), flat(0.0, 5.0), Layer(4.0, height, 0.092, permittivity=12.0))
    return Structure(end, (*half, flat(0.0, 6.0), *reversed(half)), end)


def length_nm(screened: Screened, low_V: float, high_V: float) -> float:
    """Length over which the potential fades into the left contact."""
    inside = screened.mesh.node_nm < 0.0
    x, size = screened.mesh.node_nm[inside], np.abs(screened.whole_V[inside])
    seen = (size > low_V) & (size < high_V)
    return 1.0 / float(np.polyfit(x[seen], np.log(size[seen]), 1)[0])


@pytest.mark.parametrize(("donors", "temperature"), [(1e15, 300.0), (1e16, 300.0), (1e16, 600.0)])
def test_a_small_step_fades_over_debyes_length(donors: float, temperature: float) -> None:
    layer = flat(1.02 * donors, 400.0)
    structure = Structure(contact(donors, temperature), (layer,), contact(donors, temperature))
    debye = math.sqrt(EPS * EPS0_PER_V_NM * BOLTZMANN_EV_PER_K * temperature / (donors * 1e-21))
    found = length_nm(screened_field(structure, 0.0, temperature), 1e-7, 1e-4)
    assert found == pytest.approx(debye, rel=0.015)


@pytest.mark.parametrize("donors", [1e17, 1e18, 1e20])
def test_a_small_step_fades_over_thomas_and_fermis_length(donors: float) -> None:
    structure = Structure(contact(donors, 4.0), (flat(1.02 * donors),), contact(donors, 4.0))
    energy = 2.0 / 3.0 * (structure.left.fermi_eV or 0.0)
    length = math.sqrt(EPS * EPS0_PER_V_NM * energy / (donors * 1e-21))
    found = length_nm(screened_field(structure, 0.0, 4.0), 1e-7, 1e-4)
    assert found == pytest.approx(length, rel=0.015)


@pytest.mark.parametrize("temperature", [77.0, 300.0])
def test_a_step_in_doping_against_a_collocation_solver(temperature: float) -> None:
    """1e18 beside 5e16; scipy's solver with a continuation over both halves at once."""
    left, right = contact(1e18, temperature), contact(5e16, temperature)
    structure = Structure(left, (flat(5e16, 100.0),), right)
    found = screened_field(structure, 0.0, temperature)
    kT, eps = BOLTZMANN_EV_PER_K * temperature, EPS * EPS0_PER_V_NM
    drop = (right.fermi_eV or 0.0) - (left.fermi_eV or 0.0)
    half = 150.0
    full = 1e18 * 1e-21 / float(fermi_dirac_half((left.fermi_eV or 0.0) / kT)[0])

    def slopes(_: np.ndarray, y: np.ndarray) -> np.ndarray:
        """Potential and slope at -half s and at half s."""
        count = [
            full * fermi_dirac_half(((left.fermi_eV or 0.0) + phi) / kT)[0] for phi in (y[0], y[2])
        ]
        bent = [-(1e-3 - count[0]) / eps, -(5e-5 - count[1]) / eps]
        return half * np.stack([-y[1], -bent[0], y[3], bent[1]])

    def ends(a: np.ndarray, b: np.ndarray) -> np.ndarray:
        return np.array([a[0] - a[2], a[1] - a[3], b[0], b[2] - drop])

    s = np.linspace(0.0, 1.0, 400)
    fade = drop * (1.0 - np.exp(-half * s / 15.0))
    start = np.stack([0.0 * s, 0.0 * s, fade, 0.0 * s])
    other = solve_bvp(slopes, ends, s, start, tol=1e-8, max_nodes=50_000)
    assert other.success
    for sign, row in ((-1.0, 0), (1.0, 2)):
        at = found.profile.position_nm
        at = at[(sign * at >= 0.0) & (sign * at <= 100.0)]
        expected = other.sol(sign * at / half)[row]
        seen = np.interp(at, found.profile.position_nm, found.potential_V)
        assert np.abs(seen - expected).max() < 2e-5
    assert found.report.mesh_error_eV < 1.1e-4


def test_without_charge_the_field_is_the_uniform_one() -> None:
    structure = two_barriers()
    mesh = first_mesh(structure, 300.0, (0.3, 0.3))
    mesh = replace(mesh, donors_nm3=np.zeros_like(mesh.donors_nm3))
    start = np.zeros(mesh.node_nm.size)
    start[-1] = 0.3
    nothing = relax(mesh, lambda v: (np.zeros_like(v), np.zeros_like(v)), start, lambda: None)
    at = np.isin(mesh.node_nm, uniform_field(structure).position_nm)
    inside = nothing.potential_V[at] - nothing.potential_V[at][0]
    uniform = uniform_field(structure, 0.3)
    dropped = np.append(
        0.0, np.cumsum(uniform.thickness_nm / [12.9, 12.9, 12, 12.9, 12, 12.9, 12.9])
    )
    assert np.allclose(inside / inside[-1], dropped / dropped[-1], atol=1e-12)
    contact_drop = 0.3 - inside[-1]
    assert contact_drop > 0.0  # what is no reservoir bends too


@pytest.mark.parametrize("charge", ["semi-classical", "quantum"])
def test_mirror_image_under_reversed_bias(charge: str) -> None:
    one, other = (
        screened_field(two_barriers(), bias, 300.0, charge=charge)  # type: ignore[arg-type]
        for bias in (0.1, -0.1)
    )
    mirrored = other.potential_V[::-1] + 0.1
    length = one.profile.faces_nm[1]
    assert np.allclose(one.profile.position_nm, length - other.profile.position_nm[::-1], atol=1e-6)
    assert np.abs(one.potential_V - mirrored).max() < 1e-5
    assert one.sheet_charge_left_cm2 == pytest.approx(other.sheet_charge_right_cm2, rel=1e-4)


def test_warm_start_equals_cold_start() -> None:
    structure = two_barriers()
    swept = screened_sweep(structure, [-0.4, 0.0, 0.2, 0.4], 300.0)
    for screened in swept:
        assert screened.report.converged
        cold = screened_field(structure, screened.bias_V, 300.0, mesh=screened.mesh)
        assert np.abs(cold.potential_V - screened.potential_V).max() < 1e-8
        assert np.array_equal(screened.profile.position_nm, swept[0].profile.position_nm)
    warm = screened_field(structure, 0.39, 300.0, start=swept[3])
    assert warm.mesh is swept[3].mesh
    assert screened_field(structure, 0.5, 300.0, start=swept[3]).mesh is not swept[3].mesh


@pytest.mark.parametrize(
    ("temperature", "donors", "bias"),
    list(itertools.product((4.0, 300.0, 600.0), (1e15, 1e18, 1e20), (-1.5, 0.0, 1.5))),
)
def test_hard_corners(temperature: float, donors: float, bias: float) -> None:
    found = screened_field(two_barriers(temperature, donors, 0.1 * donors), bias, temperature)
    report = found.report
    assert report.converged, report.reason
    assert report.residual < 1e-9
    assert report.neutrality < 1e-6
    assert report.mesh_error_eV < 2e-4
    assert found.profile.thickness_nm.size <= 300
    assert found.profile.layer_index[0] == -1
    assert found.profile.layer_index[-1] == 7
    edges = np.array([found.profile.edge_left_eV[0], found.profile.edge_right_eV[-1]])
    assert np.abs(edges - found.profile.contact_edge_eV).max() < 2.1e-4


def test_charges_balance_and_the_field_follows_gauss() -> None:
    found = screened_field(two_barriers(), 0.3, 300.0)
    profile = found.profile
    at = profile.layer_pieces(3)
    field = (profile.edge_left_eV[at] - profile.edge_right_eV[at]) / profile.thickness_nm[at]
    sheet = EPS * EPS0_PER_V_NM * field * 1e14
    assert sheet == pytest.approx(found.sheet_charge_left_cm2, rel=1e-6)
    assert found.sheet_charge_right_cm2 == pytest.approx(-found.sheet_charge_left_cm2, rel=1e-6)
    assert found.well_charge_cm2 == 0.0


def test_what_does_not_converge_says_so() -> None:
    found = screened_field(two_barriers(), 1.0, 300.0, most_steps=1)
    assert not found.report.converged
    assert "Newton steps" in found.report.reason
    assert math.isnan(found.report.mesh_error_eV)


def test_what_cannot_be_screened_is_refused() -> None:
    plain = Structure(Contact(0.0, MASS), (flat(0.0),), Contact(0.0, MASS))
    with pytest.raises(StructureError, match="fermi_eV is None; the screened field needs one"):
        screened_field(plain, 0.0, 300.0)
    empty = Contact(0.0, MASS, -1.0)
    with pytest.raises(StructureError, match="cannot screen a field; raise"):
        screened_field(Structure(empty, (flat(0.0),), empty), 0.0, 300.0)
    with pytest.raises(StructureError, match="bias_V"):
        screened_field(two_barriers(), math.nan, 300.0)
    with pytest.raises(StructureError, match="temperature_K"):
        screened_field(two_barriers(), 0.0, 0.0)


def test_where_the_fermi_levels_part() -> None:
    region = tunnelling_region(two_barriers())
    assert (region.start_nm, region.end_nm, region.has_barrier) == (23.0, 37.0, True)
    low = two_barriers(height=0.02)
    region = tunnelling_region(low)
    assert (region.start_nm, region.has_barrier) == (25.0, False)
    found = screened_field(low, 0.05, 300.0)
    assert found.report.converged
    assert "steps at one point, 25 nm" in found.report.model
    asked = screened_field(low, 0.05, 300.0, charge="quantum")
    assert "no region whose electrons could be waves" in asked.report.model
    end = contact(1e18, 300.0)
    assert tunnelling_region(Structure(end, (flat(1e18), flat(1e18)), end)).start_nm == 60.0


def test_a_graded_barrier_and_unlike_contacts_converge() -> None:
    layers = (flat(1e17, 20.0), Layer(15.0, 0.1, 0.08, 0.3, 0.09), flat(0.0, 10.0))
    structure = Structure(contact(1e18, 300.0), layers, contact(1e17, 300.0, 0.05))
    found = screened_field(structure, 0.2, 300.0)
    assert found.report.converged
    assert found.report.neutrality < 1e-6
    pieces = found.profile.layer_pieces(1)
    assert found.profile.mass_left[pieces][0] == 0.08
    assert found.profile.mass_right[pieces][-1] == 0.09
    fermi = fermi_levels_eV(structure, 0.2)
    assert fermi[0] - fermi[1] == pytest.approx(0.2, abs=1e-15)


def test_sweeps_go_outward_from_zero() -> None:
    assert list(outward([-0.2, -0.1, 0.1, 0.05])) == [(3, None), (2, 3), (1, 3), (0, 1)]


def test_the_whole_answer_stands_on_a_screened_profile() -> None:
    profile = screened_field(two_barriers(), 0.2, 300.0).profile
    result = scatter(profile, np.linspace(0.01, 0.3, 50))
    assert np.abs(result.transmission + result.reflection - 1.0).max() < 1e-10
    levels = find_levels(profile, 0.0, 0.25, 0.01)
    assert levels.complete
    best = max(levels.levels, key=lambda level: level.share_by_layer[3])
    assert len(best.share_by_layer) == 7
    assert best.share_by_layer[3] > 0.7


def test_one_mesh_serves_a_range() -> None:
    structure = two_barriers()
    mesh = mesh_of(structure, 300.0, np.linspace(-0.5, 0.5, 11))
    assert mesh.range_V == (-0.5, 0.5)
    electrons = thermal_electrons(mesh, fermi_levels_eV(structure, 0.0))
    count, rate = electrons(np.zeros_like(mesh.edge_eV))
    assert count[mesh.layer_index < 0] == pytest.approx(1e-3, rel=1e-12)
    assert not count[mesh.side == 0].any()
    step = 1e-6
    above = electrons(np.full_like(mesh.edge_eV, step))[0]
    below = electrons(np.full_like(mesh.edge_eV, -step))[0]
    assert np.allclose(rate, (above - below) / (2 * step), rtol=1e-6, atol=1e-12)
