"""From what was written to numbers: scales, monolayers, Fermi energies, and what disagrees."""

from __future__ import annotations

import re
from dataclasses import replace
from typing import Any

import pytest

from physics.materials import material
from physics.occupation import fermi_from_donors
from tui.session.demo import demo_text
from tui.session.model import ContactEntry, LayerEntry, MaterialEntry, Session
from tui.session.read import read_session
from tui.session.refusal import SessionError
from tui.session.resolve import resolve

DEMO = read_session(demo_text(), "demo")
PLAIN = ContactEntry(edge_eV=0.0, mass=0.067)


def with_layer(**values: Any) -> Session:
    return replace(DEMO, layers=(LayerEntry(**({"thickness_nm": 3.0} | values)),))


def refusal(session: Session) -> SessionError:
    with pytest.raises(SessionError) as caught:
        resolve(session)
    return caught.value


def test_catalogue_materials_are_measured_from_the_left_contact() -> None:
    structure = resolve(DEMO)
    barrier, contact = material("Al0.4Ga0.6As", 300.0), material("GaAs", 300.0)
    assert structure.left.edge_eV == 0.0
    assert structure.layers[1].edge_eV == pytest.approx(barrier.edge_eV - contact.edge_eV)
    assert structure.layers[1].mass == barrier.mass
    assert structure.layers[1].x_edge_eV == pytest.approx(
        (barrier.x_edge_eV or 0) - contact.edge_eV
    )


def test_monolayers() -> None:
    """Half a lattice constant each (common practice): 10 of Al0.4Ga0.6As."""
    layer = resolve(DEMO).layers[1]
    assert layer.thickness_nm == pytest.approx(10 * 0.5 * (0.4 * 0.56611 + 0.6 * 0.565325))


def test_donors_set_the_fermi_energy_at_the_temperature() -> None:
    for kelvin in (4.0, 300.0):
        session = replace(DEMO, conditions=replace(DEMO.conditions, temperature_K=kelvin))
        contact = resolve(session).left
        assert contact.fermi_eV == fermi_from_donors(2e17, contact.mass, kelvin)


def test_own_materials_are_on_the_session_scale() -> None:
    mine = MaterialEntry("Mine", 0.21, 0.085, 12.1, 0.283)
    session = replace(
        with_layer(material="Mine", thickness_nm=None, thickness_ml=10), materials=(mine,)
    )
    layer = resolve(session).layers[0]
    assert (layer.edge_eV, layer.mass, layer.permittivity) == (0.21, 0.085, 12.1)
    assert layer.thickness_nm == pytest.approx(2.83)
    left = replace(session, left=ContactEntry(material="Mine"), right=PLAIN)
    assert resolve(left).left.edge_eV == 0.21


def test_a_catalogue_material_has_no_place_on_an_unknown_scale() -> None:
    session = replace(with_layer(material="AlAs"), left=PLAIN, right=PLAIN)
    error = refusal(session)
    assert error.key == "layer 1 material"
    assert "left contact's material" in error.allowed


def test_grades() -> None:
    session = with_layer(material="GaAs", to_material="Al0.3Ga0.7As")
    layer = resolve(session).layers[0]
    end = material("Al0.3Ga0.7As", 300.0)
    assert layer.edge_eV == pytest.approx(0.0)
    assert layer.to_edge_eV == pytest.approx(end.edge_eV - material("GaAs", 300.0).edge_eV)
    assert layer.to_mass == end.mass


@pytest.mark.parametrize(
    ("values", "key"),
    [
        ({"material": "AlAs", "edge_eV": 0.5}, "layer 1 edge_eV"),
        ({"material": "AlAs", "mass": 0.5}, "layer 1 mass"),
        ({"material": "AlAs", "thickness_ml": 3}, "layer 1 thickness_nm"),
        ({"material": "GaAs", "to_material": "AlAs", "to_edge_eV": 0.1}, "layer 1 to_edge_eV"),
        ({"material": "Al1.3Ga0.7As"}, "layer 1 material"),
        ({"material": "Unobtainium"}, "layer 1 material"),
        ({"material": "\x1b[2J"}, "layer 1 material"),
        (
            {"edge_eV": 0.3, "mass": 0.09, "thickness_nm": None, "thickness_ml": 3},
            "layer 1 thickness_ml",
        ),
    ],
)
def test_what_disagrees_or_is_unknown(values: dict[str, Any], key: str) -> None:
    error = refusal(with_layer(**values))
    assert error.key == key
    assert "\x1b" not in str(error)


def test_what_agrees_is_taken() -> None:
    known = material("AlAs", 300.0)
    edge = known.edge_eV - material("GaAs", 300.0).edge_eV
    session = with_layer(material="AlAs", mass=known.mass, edge_eV=edge)
    assert resolve(session).layers[0].mass == known.mass


def test_fermi_energies() -> None:
    filled = fermi_from_donors(1e18, 0.067, 300.0)
    both = ContactEntry(material="GaAs", donors_cm3=1e18, fermi_eV=filled)
    assert resolve(replace(DEMO, left=both)).left.fermi_eV == filled
    wrong = replace(both, fermi_eV=0.2)
    assert refusal(replace(DEMO, left=wrong)).key == "left fermi_eV"
    one_sided = replace(DEMO, right=ContactEntry(material="GaAs"))
    error = refusal(one_sided)
    assert "both contacts" in error.allowed


def test_the_line_is_found_afterwards() -> None:
    text = demo_text().replace("Al0.4Ga0.6As", "Al1.4Ga0.6As", 1)
    error = refusal(read_session(text, "d")).located(text, "d.toml")
    wanted = 1 + text[: text.index("Al1.4")].count("\n")
    assert (error.source, error.line) == ("d.toml", wanted)


def text_of(left: str, layer: str, right: str) -> str:
    return f"format = 1\n[left]\n{left}\n[[layer]]\n{layer}\n[right]\n{right}\n"


GAAS = 'material = "GaAs"'
NUMBERS = "edge_eV = 0.1\nmass = 0.067"
TWO_NM = "thickness_nm = 2.0"


@pytest.mark.parametrize(
    ("text", "key", "line", "remedy"),
    [
        (
            text_of(f"{GAAS}\nedge_eV = 0.1", f"{GAAS}\n{TWO_NM}", GAAS),
            "left edge_eV",
            4,
            "keep one",
        ),
        (text_of(NUMBERS, f"{GAAS}\n{TWO_NM}", NUMBERS), "layer 1 material", 6, "left contact's"),
        (text_of(NUMBERS, f"{NUMBERS}\n{TWO_NM}", GAAS), "right material", 10, "left contact's"),
        (text_of(GAAS, f"{GAAS}\nthickness_ml = 1e6", GAAS), "layer 1 thickness_nm", 4, "1e5 nm"),
        (text_of(GAAS, f"{GAAS}\nthickness_ml = 1e-9", GAAS), "layer 1 thickness_nm", 4, "1e-6"),
        (text_of(GAAS, f"{NUMBERS}\nthickness_ml = 9", GAAS), "layer 1 thickness_ml", 7, "nm"),
        (
            text_of(f"{GAAS}\ndonors_cm3 = 1e18", f"{GAAS}\n{TWO_NM}", GAAS),
            "right fermi_eV",
            8,
            "both",
        ),
        (text_of(GAAS, f"{GAAS}\n{TWO_NM}", f"{GAAS}\nfermi_eV = 0.1"), "left fermi_eV", 2, "both"),
        (text_of(GAAS, f'material = "AlGaAs"\n{TWO_NM}', GAAS), "layer 1 material", 5, "fraction"),
        (
            text_of(GAAS, f'material = "gaas"\n{TWO_NM}', GAAS),
            "layer 1 material",
            5,
            "Al0.3Ga0.7As",
        ),
        (text_of(GAAS, f'material = ""\n{TWO_NM}', GAAS), "layer 1 material", 5, "[material.NAME]"),
        (
            text_of(GAAS, f'{GAAS}\nto_material = "AlAs"\nto_mass = 0.2\n{TWO_NM}', GAAS),
            "layer 1 to_mass",
            7,
            "keep one",
        ),
    ],
)
def test_lines_and_remedies(text: str, key: str, line: int, remedy: str) -> None:
    session = read_session(text, "x.toml")
    error = refusal(session).located(text, "x.toml")
    assert (error.key, error.line) == (key, line)
    assert remedy in error.allowed
    assert str(error).startswith(f"x.toml, line {line}: {key} ")


@pytest.mark.parametrize(
    "layer",
    [
        'material = "Al0.3Ga0.7As"\nedge_eV = 0.3\nthickness_nm = 2.0',
        'material = "In0.53Ga0.47As"\nmass = 0.05\nthickness_nm = 2.0',
        'material = "Al0.37Ga0.63As"\nthickness_nm = 2.83\nthickness_ml = 10',
        'material = "AlAs"\nto_material = "GaP"\nto_edge_eV = 0.1\nthickness_nm = 2.0',
    ],
)
def test_the_number_that_a_refusal_gives_is_accepted(layer: str) -> None:
    text = text_of(GAAS, layer, GAAS)
    error = refusal(read_session(text, "x"))
    given = re.search(r"is ([^ ]+), but [^ ]+ makes it ([^ ]+)", error.found)
    assert given is not None
    key = str(error.path[-1])
    mended = re.sub(rf"{key} = [0-9.]+", f"{key} = {given[2]}", text)
    assert mended != text
    resolve(read_session(mended, "x"))


def test_the_users_own_material_hides_the_catalogues() -> None:
    mine = MaterialEntry("GaAs", 0.05, 0.07)
    structure = resolve(replace(with_layer(material="GaAs"), materials=(mine,)))
    assert (structure.left.edge_eV, structure.layers[0].mass) == (0.05, 0.07)


def test_monolayers_of_a_grade_are_those_of_its_first_face() -> None:
    layer = resolve(
        with_layer(material="GaAs", to_material="InAs", thickness_nm=None, thickness_ml=10)
    ).layers[0]
    assert layer.thickness_nm == pytest.approx(10 * 0.5 * 0.565325)  # GaAs at 300 K


def test_monolayers_are_counted_at_room_temperature() -> None:
    """A count grown at 300 K stays what it is in the cryostat; edges follow the temperature."""
    session = with_layer(material="AlAs", thickness_nm=None, thickness_ml=7)
    cold = replace(session, conditions=replace(session.conditions, temperature_K=4.0))
    warm_layer, cold_layer = resolve(session).layers[0], resolve(cold).layers[0]
    assert warm_layer.thickness_nm == cold_layer.thickness_nm
    assert warm_layer.edge_eV != cold_layer.edge_eV


def test_a_stated_permittivity_goes_before_the_materials() -> None:
    assert resolve(with_layer(material="GaAs", permittivity=10.0)).layers[0].permittivity == 10.0
    assert resolve(with_layer(material="GaAs")).layers[0].permittivity == pytest.approx(12.9, 0.01)


KANE = replace(DEMO, conditions=replace(DEMO.conditions, band="kane"))


def test_gaps_are_the_materials_unless_stated() -> None:
    structure = resolve(KANE)
    assert structure.left.gap_eV == material("GaAs", 300.0).gap_eV
    assert structure.layers[1].gap_eV == material("Al0.4Ga0.6As", 300.0).gap_eV
    assert resolve(with_layer(material="GaAs", gap_eV=1.5)).layers[0].gap_eV == 1.5
    grade = with_layer(material="GaAs", to_material="AlAs")
    assert resolve(grade).layers[0].to_gap_eV == material("AlAs", 300.0).gap_eV
    stated = with_layer(material="GaAs", to_material="AlAs", to_gap_eV=2.0)
    assert resolve(stated).layers[0].to_gap_eV == 2.0
    mine = MaterialEntry("Mine", 0.21, 0.085, gap_eV=1.1)
    assert resolve(replace(with_layer(material="Mine"), materials=(mine,))).layers[0].gap_eV == 1.1


@pytest.mark.parametrize(
    ("changes", "key"),
    [
        ({"layers": (LayerEntry(edge_eV=0.3, mass=0.09, thickness_nm=2.0),)}, "layer 1 gap_eV"),
        ({"right": replace(DEMO.right, material=None, edge_eV=0.0, mass=0.067)}, "right gap_eV"),
        (
            {"layers": (LayerEntry(material="GaAs", to_material="Mine", thickness_nm=2.0),)},
            "layer 1 to_gap_eV",
        ),
    ],
)
def test_a_band_that_needs_gaps_is_refused_without(changes: dict[str, Any], key: str) -> None:
    own = (MaterialEntry("Mine", 0.21, 0.085),)
    assert resolve(replace(DEMO, materials=own, **changes))
    error = refusal(replace(KANE, materials=own, **changes))
    assert (error.key, error.found) == (key, "is missing")
    assert "band = parabolic" in error.allowed
