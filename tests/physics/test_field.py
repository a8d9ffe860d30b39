"""The uniform field: where the drop falls."""

import numpy as np
import pytest

from physics.errors import StructureError
from physics.field import built_in_eV, uniform_field, without_runways
from physics.structure import Contact, Layer, Structure

CONTACT = Contact(0.0, 0.067)


def test_drop_is_linear_across_the_layers() -> None:
    layers = (Layer(1.0, 0.3, 0.09), Layer(3.0, 0.0, 0.067))
    profile = uniform_field(Structure(CONTACT, layers, CONTACT), 0.4)
    assert profile.edge_left_eV == pytest.approx([0.3, -0.1])
    assert profile.edge_right_eV == pytest.approx([0.2, -0.4])
    assert profile.contact_edge_eV == pytest.approx((0.0, -0.4))
    x = np.array([-1.0, 0.0, 0.5, 1.0, 4.0, 5.0])
    assert profile.edge_eV(x) == pytest.approx([0.0, 0.3, 0.25, -0.1, -0.4, -0.4])


def test_field_goes_with_one_over_permittivity() -> None:
    """Continuity of the displacement: Gauss's law (any textbook of electrodynamics)."""
    layers = (Layer(2.0, 0.0, 0.067, permittivity=10.0), Layer(2.0, 0.0, 0.067, permittivity=5.0))
    profile = uniform_field(Structure(CONTACT, layers, CONTACT), 0.3)
    drops = profile.edge_left_eV - profile.edge_right_eV
    assert drops == pytest.approx([0.1, 0.2])
    assert 10.0 * drops[0] / 2.0 == pytest.approx(5.0 * drops[1] / 2.0)


def test_built_in_lines_up_the_fermi_levels() -> None:
    left, right = Contact(0.0, 0.067, fermi_eV=0.05), Contact(0.1, 0.067, fermi_eV=0.02)
    structure = Structure(left, (Layer(2.0, 0.3, 0.09),), right)
    assert built_in_eV(structure) == pytest.approx(0.07)
    at_rest = uniform_field(structure, 0.0)
    assert at_rest.contact_edge_eV[1] + 0.02 == pytest.approx(0.05)
    biased = uniform_field(structure, 0.2)
    assert biased.contact_edge_eV[1] == pytest.approx((0.0 + 0.05) - 0.02 - 0.2)


def test_without_fermi_energies_the_contacts_stay_where_they_are() -> None:
    structure = Structure(CONTACT, (Layer(2.0, 0.3, 0.09),), Contact(0.1, 0.067))
    assert uniform_field(structure, 0.25).contact_edge_eV == pytest.approx((0.0, -0.15))


@pytest.mark.parametrize("bias", [float("nan"), 51.0, -51.0])
def test_bias_out_of_range(bias: float) -> None:
    with pytest.raises(StructureError, match="bias_V"):
        uniform_field(Structure(CONTACT, (Layer(2.0, 0.3, 0.09),), CONTACT), bias)


def test_runways_are_taken_away() -> None:
    spacer, barrier = Layer(30.0, 0.0, 0.067), Layer(2.0, 0.3, 0.09)
    other = Layer(4.0, 0.0, 0.08)  # the contact's edge, but not its mass
    stack = Structure(CONTACT, (spacer, spacer, barrier, spacer, other, spacer), CONTACT)
    core = without_runways(uniform_field(stack))
    assert core.layer_index.tolist() == [2, 3, 4]
    assert core.position_nm == pytest.approx([0.0, 2.0, 32.0, 36.0])
    assert without_runways(uniform_field(stack, 0.1)).layer_index.size == 6
    plain = Structure(CONTACT, (spacer, spacer), CONTACT)
    assert without_runways(uniform_field(plain)).layer_index.size == 1
    right = Structure(CONTACT, (barrier, spacer), CONTACT)
    assert without_runways(uniform_field(right)).layer_index.tolist() == [0]
