"""What is described checks itself."""

import math

import pytest

from physics.errors import StructureError
from physics.structure import MAX_LAYERS, Contact, Layer, Structure

CONTACT = Contact(0.0, 0.067)
LAYER = Layer(2.0, 0.3, 0.092)


@pytest.mark.parametrize(
    ("layer", "key"),
    [
        (Layer(0.0, 0.3, 0.092), "thickness_nm"),
        (Layer(5e-324, 0.3, 0.092), "thickness_nm"),
        (Layer(1e-12, 0.3, 0.092), "thickness_nm"),
        (Layer(-1.0, 0.3, 0.092), "thickness_nm"),
        (Layer(math.nan, 0.3, 0.092), "thickness_nm"),
        (Layer(math.inf, 0.3, 0.092), "thickness_nm"),
        (Layer(2.0, math.nan, 0.092), "edge_eV"),
        (Layer(2.0, 0.3, 0.0), "mass"),
        (Layer(2.0, 0.3, -0.1), "mass"),
        (Layer(2.0, 0.3, 0.092, to_edge_eV=math.inf), "to_edge_eV"),
        (Layer(2.0, 0.3, 0.092, to_mass=0.0), "to_mass"),
        (Layer(2.0, 0.3, 0.092, permittivity=0.0), "permittivity"),
        (Layer(2.0, 0.3, 0.092, donors_cm3=-1.0), "donors_cm3"),
    ],
)
def test_bad_layer_is_named(layer: Layer, key: str) -> None:
    with pytest.raises(StructureError) as caught:
        Structure(CONTACT, (LAYER, layer), CONTACT)
    assert caught.value.where == "layer 2"
    assert caught.value.key == key
    assert caught.value.allowed in str(caught.value)


@pytest.mark.parametrize("count", [0, MAX_LAYERS + 1])
def test_number_of_layers(count: int) -> None:
    with pytest.raises(StructureError, match="stack has 1 to"):
        Structure(CONTACT, (LAYER,) * count, CONTACT)


def test_total_thickness() -> None:
    with pytest.raises(StructureError, match="nm thick"):
        Structure(CONTACT, (Layer(9e4, 0.0, 0.067),) * 2, CONTACT)


def test_contacts() -> None:
    with pytest.raises(StructureError, match="right: mass"):
        Structure(CONTACT, (LAYER,), Contact(0.0, math.nan))
    with pytest.raises(StructureError, match="right: fermi_eV") as caught:
        Structure(Contact(0.0, 0.067, fermi_eV=0.05), (LAYER,), CONTACT)
    assert "for both contacts, or for neither" in str(caught.value)
