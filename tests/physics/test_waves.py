"""Electrons between the barriers as waves, held against plain sums over energy and over levels."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from physics.charge import fermi_levels_eV
from physics.constants import BOLTZMANN_EV_PER_K, HBAR_EV_S
from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C_EV_NM2
from physics.field import Profile, uniform_field
from physics.levels import find_levels
from physics.occupation import fermi_from_donors
from physics.poisson import screened_field, screened_sweep
from physics.structure import Contact, Layer, Structure
from physics.wavefunction import (
    injected_density_of_states,
    local_density_of_states,
    scattering_state,
)
from physics.waves import merged_lines

MASS = 0.067


def diode(
    temperature: float, first: float = 3.0, second: float = 3.0, well_edge: float = 0.0
) -> Structure:
    """Two barriers and a well between doped spacers."""
    end = Contact(0.0, MASS, fermi_from_donors(1e18, MASS, temperature), permittivity=12.9)
    spacer = Layer(12.0, 0.0, MASS, permittivity=12.9, donors_cm3=2e17)
    barriers = [Layer(d, 0.3, 0.092, permittivity=12.0) for d in (first, second)]
    well = Layer(6.0, well_edge, MASS, permittivity=12.9)
    return Structure(end, (spacer, barriers[0], well, barriers[1], spacer), end)


def filled_cm3(
    structure: Structure, profile: Profile, bias: float, temperature: float, at: list[float]
) -> np.ndarray:
    """Sum over evenly spaced energies what both contacts bring in, with the mass of the well."""
    kT, fermi = BOLTZMANN_EV_PER_K * temperature, fermi_levels_eV(structure, bias)
    energy = np.linspace(min(profile.contact_edge_eV), max(fermi) + 22.0 * kT, 40_001)
    brought = injected_density_of_states(profile, np.array(at), energy)
    filling = [np.logaddexp(0.0, (level - energy) / kT) for level in fermi]
    both = brought[0] * filling[0] + brought[1] * filling[1]
    integral = 0.5 * ((both[:, 1:] + both[:, :-1]) * np.diff(energy)).sum(axis=1)
    return np.asarray(integral * kT * MASS / (2.0 * math.pi * C_EV_NM2) * 1e21)


@pytest.mark.parametrize(("temperature", "bias"), [(300.0, 0.0), (300.0, 0.2), (77.0, 0.1)])
def test_density_against_a_plain_sum_over_energies(temperature: float, bias: float) -> None:
    structure = diode(temperature)
    found = screened_field(structure, bias, temperature, charge="quantum")
    assert found.report.converged, found.report.reason
    at = found.profile.position_nm
    inside = at[(at > 15.5) & (at < 20.5)]
    some = [float(x) for x in inside[:: max(1, inside.size // 4)]]
    expected = filled_cm3(structure, found.profile, bias, temperature, some)
    seen = np.interp(some, at, found.electrons_cm3)
    assert seen == pytest.approx(expected, rel=2e-3)


@pytest.mark.parametrize(("temperature", "thickness"), [(300.0, 9.0), (77.0, 20.0)])
def test_a_narrow_level_holds_what_a_level_holds(temperature: float, thickness: float) -> None:
    """In equilibrium, filled by both sides alike; far narrower than any step of energy."""
    structure = diode(temperature, thickness, thickness, well_edge=-0.04)
    found = screened_field(structure, 0.0, temperature, charge="quantum")
    assert found.report.converged
    levels = find_levels(found.profile, 0.0, 0.12, 1e-4).levels
    level = max(levels, key=lambda level: level.share_by_layer[2])
    assert level.width_eV < 1e-6
    kT = BOLTZMANN_EV_PER_K * temperature
    fermi = structure.left.fermi_eV or 0.0
    mass = sum(
        share * layer.mass
        for share, layer in zip(level.share_by_layer, structure.layers, strict=True)
    )
    per_nm2 = mass / (2.0 * math.pi * C_EV_NM2) * kT
    held = per_nm2 * math.log1p(math.exp((fermi - level.energy_eV) / kT)) * 1e14
    # What leans into the barriers from outside, or lies above, is a few per cent more.
    assert found.well_charge_cm2 == pytest.approx(held, rel=0.3)
    assert found.well_charge_cm2 > 0.98 * held


def test_levels_that_no_wave_reaches_are_filled_too() -> None:
    structure = diode(77.0, 5.0, 5.0, well_edge=-0.8)
    rest = screened_field(structure, 0.0, 77.0, charge="quantum")
    assert rest.report.converged
    assert rest.well_charge_cm2 > 5e11
    assert "filled to the lower" not in rest.report.model
    driven = screened_field(structure, 0.02, 77.0, charge="quantum")
    assert driven.report.converged
    assert (
        "levels below both contacts' edges filled to the lower Fermi level" in driven.report.model
    )
    assert driven.well_charge_cm2 < rest.well_charge_cm2


def test_a_level_fills_from_the_side_it_is_open_to() -> None:
    """Behind a thick collector barrier a level under bias fills, behind a thin one it empties."""
    charge = [
        screened_field(diode(77.0, *barriers), 0.12, 77.0, charge="quantum").well_charge_cm2
        for barriers in ((3.0, 6.0), (6.0, 3.0))
    ]
    assert charge[0] > 5.0 * charge[1]


def test_a_sweep_keeps_its_pieces_and_converges() -> None:
    swept = screened_sweep(diode(77.0), [0.0, 0.1, 0.15], 77.0, charge="quantum")
    assert all(screened.report.converged for screened in swept)
    assert len({screened.profile.thickness_nm.size for screened in swept}) == 1
    assert all(screened.report.neutrality < 1e-6 for screened in swept)


def test_both_contacts_bring_in_all_there_is() -> None:
    profile = uniform_field(replace(diode(300.0)), 0.1)
    x, energy = np.array([5.0, 18.0, 30.0]), np.linspace(-0.05, 0.4, 40)
    brought = injected_density_of_states(profile, x, energy)
    all_there_is = local_density_of_states(profile, x, energy)
    assert brought.sum(axis=0) == pytest.approx(all_there_is, rel=1e-12)
    assert not brought[0][:, energy < 0.0].any()  # the left contact is closed there


def test_what_the_left_contact_brings_in_is_its_wave() -> None:
    profile = uniform_field(diode(300.0), 0.1)
    density = scattering_state(profile, 0.07)
    brought = injected_density_of_states(profile, density.x_nm[::50], np.array([0.07]))[0][:, 0]
    velocity = 2.0 * math.sqrt(C_EV_NM2 / MASS * 0.07) / HBAR_EV_S
    expected = density.density_per_nm[::50] / (2.0 * math.pi * HBAR_EV_S * velocity)
    assert brought == pytest.approx(expected, rel=1e-9)


def test_lines_that_overlap_are_one() -> None:
    levels = find_levels(uniform_field(diode(300.0, 9.0, 9.0)), 0.0, 0.3).levels
    level = next(level for level in levels if level.width_eV < 1e-5)
    near = replace(level, energy_eV=level.energy_eV + level.width_eV)
    far = replace(level, energy_eV=level.energy_eV + 0.1)
    lines = merged_lines([level, near, far])
    assert len(lines) == 2
    assert lines[0][0] < level.energy_eV < near.energy_eV < lines[0][1]
