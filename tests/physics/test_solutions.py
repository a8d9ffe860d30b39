"""Currents in a screened field: one mesh, warm starts, capacitance, what is said of failures."""

from dataclasses import replace

import numpy as np
import pytest

from physics.constants import ELECTRIC_CONSTANT_F_PER_M
from physics.curve import Drive, curve_at
from physics.solutions import solutions_over
from physics.structure import Contact, Layer, Structure

CONTACT = Contact(0.0, 0.067, 0.054, permittivity=12.9)


def diode(spacer_nm: float = 25.0, donors_cm3: float = 1e17) -> Structure:
    """60 nm with doped spacers."""
    doped = Layer(spacer_nm, 0.0, 0.067, permittivity=12.9, donors_cm3=donors_cm3)
    wall = Layer(2.5, 0.3, 0.092, permittivity=12.0)
    well = Layer(5.0, 0.0, 0.067, permittivity=12.9)
    return Structure(CONTACT, (doped, wall, well, wall, doped), CONTACT)


def test_61_biases_of_a_diode_with_doped_spacers() -> None:
    structure = diode()
    solutions = solutions_over(structure, 300.0, (0.0, 0.6))
    drive = Drive(structure, 300.0, solutions.profiles)
    curve = curve_at(drive, np.linspace(0.0, 0.6, 61))
    assert curve.reached.all()
    assert curve.current_density_A_per_cm2[0] == 0.0
    assert len(solutions.known) == 61
    for found in solutions.known.values():
        assert found.report.converged
        assert found.report.residual < 1e-8
        assert found.report.neutrality < 1e-8
        assert found.report.mesh_error_eV < 2e-4


def test_mirror_symmetry_survives_screening() -> None:
    structure = diode()
    solutions = solutions_over(structure, 77.0, (-0.3, 0.3))
    bias = np.array([0.01, 0.1, 0.3])
    curve = curve_at(Drive(structure, 77.0, solutions.profiles), np.append(bias, -bias))
    current = curve.current_density_A_per_cm2
    # The two sides' potentials are solved to 1e-9 V or so, which a narrow level feels.
    assert current == pytest.approx(-current[::-1], rel=1e-4)


def test_all_profiles_have_the_same_pieces_whatever_the_order() -> None:
    structure = diode(5.0)
    solutions = solutions_over(structure, 300.0, (-0.2, 0.5))
    first = solutions.profiles(np.array([0.4, -0.2, 0.1]))
    second = solutions.profiles(np.array([0.25]))
    for profile in [*first, *second]:
        assert profile.position_nm.tolist() == first[0].position_nm.tolist()
    cold = solutions_over(structure, 300.0, (-0.2, 0.5)).profiles(np.array([0.25]))
    assert second[0].edge_left_eV == pytest.approx(cold[0].edge_left_eV, abs=1e-8)


def test_capacitance_of_plates_between_metals() -> None:
    """Contacts doped so high that nothing but the plain layers between them is charged."""
    metal = replace(CONTACT, fermi_eV=0.8)
    wall = Layer(20.0, 1.5, 0.1, permittivity=12.9)
    structure = Structure(metal, (wall,), metal)
    solutions = solutions_over(structure, 300.0, (0.0, 0.2))
    plates = ELECTRIC_CONSTANT_F_PER_M * 12.9 / 20e-9 * 1e-4
    found = solutions.space_charge_F_per_cm2(0.1)
    assert 0.75 * plates < found < plates  # the charge sits a Thomas-Fermi length deep


def test_two_band_masses_reach_the_screened_profile() -> None:
    structure = diode(5.0)
    layers = tuple(replace(layer, gap_eV=1.4) for layer in structure.layers)
    contact = replace(CONTACT, gap_eV=1.4)
    grown = Structure(contact, layers, contact)
    solutions = solutions_over(grown, 300.0, (0.0, 0.3), band="kane")
    (profile,) = solutions.profiles(np.array([0.2]))
    assert profile.mass_slope_left == pytest.approx(profile.mass_left / 1.4)
    assert profile.mass_slope_right == pytest.approx(profile.mass_right / 1.4)
    assert profile.contact_mass_slope == pytest.approx((0.067 / 1.4,) * 2)
