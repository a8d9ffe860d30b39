"""Growth errors on structures."""

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from physics.alloy_errors import Makeup, shifted
from physics.errors import StructureError
from physics.field import uniform_field
from physics.grading import graded, unlike_faces
from physics.growth_errors import Deviations, drawn, growth_errors
from physics.levels import find_levels
from physics.materials import material
from physics.occupation import fermi_from_donors
from physics.structure import Contact, Layer, Structure

WELL, WALL = material("GaAs"), material("Al0.3Ga0.7As")
ZERO_EV = WELL.edge_eV
DONORS = 1e18


def layer(name: str, thickness_nm: float) -> Layer:
    known = material(name)
    return Layer(
        thickness_nm,
        known.edge_eV - ZERO_EV,
        known.mass,
        permittivity=known.permittivity,
        name=known.name,
        monolayer_nm=known.monolayer_nm,
        gap_eV=known.gap_eV,
    )


def stack() -> tuple[Structure, Makeup]:
    fermi = fermi_from_donors(DONORS, WELL.mass, 300.0)
    contact = Contact(0.0, WELL.mass, fermi, "GaAs", DONORS)
    names = ("GaAs", "Al0.3Ga0.7As", "GaAs", "Al0.3Ga0.7As")
    layers = tuple(layer(name, 5.0 + n) for n, name in enumerate(names))
    makeup = Makeup("GaAs", tuple((name, None) for name in names), "GaAs", material)
    return Structure(contact, layers, contact), makeup


def test_no_error_is_the_design() -> None:
    structure, makeup = stack()
    errors = growth_errors(structure, Deviations(0.01, 0.1, 0.5, 0.01, 0.05), makeup, 300.0)
    assert drawn(errors, [0.0] * len(errors.variables)) == structure
    names = [variable.name for variable in errors.variables]
    assert names == [
        "rate GaAs",
        "rate Al0.3Ga0.7As",
        *(f"thickness layer {n}" for n in range(1, 5)),
        "composition Al0.3Ga0.7As",
        "donors left",
        "donors right",
    ]


def test_a_rate_moves_all_layers_of_a_material() -> None:
    structure, makeup = stack()
    errors = growth_errors(structure, Deviations(rate=0.02), makeup, 300.0)
    made = drawn(errors, [0.0, 1.5])
    ratio = [
        a.thickness_nm / b.thickness_nm for a, b in zip(made.layers, structure.layers, strict=True)
    ]
    assert ratio == pytest.approx([1.0, 1.03, 1.0, 1.03], rel=1e-12)


def test_a_composition_is_the_catalogue_s() -> None:
    structure, makeup = stack()
    errors = growth_errors(structure, Deviations(composition=0.01), makeup, 300.0)
    made = drawn(errors, [2.0])
    richer = material("Al0.32Ga0.68As")
    for number in (1, 3):
        assert made.layers[number].edge_eV == pytest.approx(richer.edge_eV - ZERO_EV, rel=1e-9)
        assert made.layers[number].mass == pytest.approx(richer.mass, rel=1e-9)
        assert made.layers[number].permittivity == pytest.approx(richer.permittivity, rel=1e-9)
    assert made.layers[0] == structure.layers[0]


def test_an_alloy_contact_stays_the_zero() -> None:
    structure, makeup = stack()
    alloy = material("Al0.1Ga0.9As")
    left = Contact(0.0, alloy.mass, 0.05, alloy.name)
    layers = tuple(
        replace(part, edge_eV=part.edge_eV + ZERO_EV - alloy.edge_eV) for part in structure.layers
    )
    right = replace(structure.right, edge_eV=ZERO_EV - alloy.edge_eV, fermi_eV=0.05)
    makeup = replace(makeup, left=alloy.name)
    errors = growth_errors(
        Structure(left, layers, right), Deviations(composition=0.01), makeup, 300.0
    )
    assert [variable.formula for variable in errors.variables] == [alloy.name, WALL.name]
    made = drawn(errors, [1.0, 0.0])
    assert made.left.edge_eV == 0.0
    zero = material("Al0.11Ga0.89As").edge_eV
    assert made.layers[1].edge_eV == pytest.approx(WALL.edge_eV - zero, rel=1e-9)


def test_donors_take_the_fermi_energy_along() -> None:
    structure, makeup = stack()
    errors = growth_errors(structure, Deviations(donors=0.1), makeup, 300.0)
    made = drawn(errors, [1.0, 0.0])
    assert made.left.fermi_eV == fermi_from_donors(DONORS * 1.1, WELL.mass, 300.0)
    assert made.right == structure.right


@pytest.mark.parametrize(
    ("formula", "sublattice", "name"),
    [
        ("Al0.3Ga0.7As", 0, "Al0.31Ga0.69As"),
        ("In0.53Ga0.47As", 0, "Ga0.48In0.52As"),
        ("GaAs0.5Sb0.5", 1, "GaAs0.51Sb0.49"),
        ("Al0.4Ga0.2In0.4As", 0, "Al0.41Ga0.196666667In0.393333333As"),
    ],
)
def test_shifted_formulas(formula: str, sublattice: int, name: str) -> None:
    assert material(shifted(formula, sublattice, 0.01)).edge_eV == pytest.approx(
        material(name).edge_eV, abs=1e-8
    )


def test_fractions_end_at_0_and_1() -> None:
    assert material(shifted("Al0.01Ga0.99As", 0, -0.5)).edge_eV == WELL.edge_eV
    assert material(shifted("Al0.99Ga0.01As", 0, 0.5)).edge_eV == material("AlAs").edge_eV


def test_grades_leave_thickness_and_mean_edge_alone() -> None:
    structure, _ = stack()
    faces = unlike_faces(structure)
    assert faces == (1, 2, 3, 4)
    made = graded(structure, 0.6, faces)
    in_contact_nm = 0.3
    assert made.thickness_nm == pytest.approx(structure.thickness_nm + in_contact_nm, rel=1e-12)
    area = [
        sum(0.5 * (part.edge_eV + part.right_edge_eV) * part.thickness_nm for part in which.layers)
        for which in (made, structure)
    ]
    assert area[0] == pytest.approx(area[1], rel=1e-12)
    ends = [(part.edge_eV, part.right_edge_eV) for part in made.layers]
    jumps = [abs(a[1] - b[0]) for a, b in pairwise(ends)]
    assert max(jumps) < 1e-12


def test_a_grade_s_effect_goes_by_its_square() -> None:
    structure, _ = stack()
    faces = unlike_faces(structure)

    def level(width_nm: float) -> float:
        made = graded(structure, width_nm, faces)
        return find_levels(uniform_field(made), 0.01, 0.2).levels[0].energy_eV

    plain = find_levels(uniform_field(structure), 0.01, 0.2).levels[0].energy_eV
    assert level(0.0) == pytest.approx(plain, abs=1e-8)
    ratio = (level(0.4) - plain) / (level(0.2) - plain)
    assert ratio == pytest.approx(4.0, rel=0.05)


def test_monolayers_have_to_be_known() -> None:
    contact = Contact(0.0, 0.067)
    bare = Structure(contact, (Layer(5.0, 0.3, 0.09),), contact)
    makeup = Makeup(None, ((None, None),), None, material)
    with pytest.raises(StructureError, match="thickness error in nm"):
        growth_errors(bare, Deviations(thickness_ml=1.0), makeup, 300.0)
    errors = growth_errors(bare, Deviations(thickness_nm=3.0), makeup, 300.0)
    thinnest = drawn(errors, np.array([-4.0]).tolist()).layers[0].thickness_nm
    assert thinnest == 1e-3
