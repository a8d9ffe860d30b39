"""A named substrate: catalogue materials are strained to it, what is stated in numbers is not."""

from __future__ import annotations

from dataclasses import replace

import pytest

from physics.advice import Advice
from physics.materials import material
from physics.strain import critical_thickness_nm, poisson_ratio, strain_on
from physics.strain_notes import strain_notes
from physics.structure import Structure
from tui.session.model import Growth, Session
from tui.session.read import read_session
from tui.session.refusal import SessionError
from tui.session.resolve import medium_of, resolve, scale_of
from tui.study import Request, solve

HEAD = "format = 1\n"
WELL = 'material = "In0.2Ga0.8As"\n'


def text_of(
    *layers: str, substrate: str = "GaAs", left: str = "GaAs", right: str = "GaAs", own: str = ""
) -> str:
    growth = f'[growth]\nsubstrate = "{substrate}"\n' if substrate else ""
    body = "".join(f"[[layer]]\n{layer}\n" for layer in layers)
    ends = f'[left]\nmaterial = "{left}"\n{body}[right]\nmaterial = "{right}"\n'
    return HEAD + growth + ends + own


def session_of(*layers: str, **more: str) -> Session:
    return read_session(text_of(*layers, **more), "x.toml")


def structure_of(*layers: str, **more: str) -> Structure:
    return resolve(session_of(*layers, **more))


def texts(structure: Structure) -> list[str]:
    return [text for text, _ in strain_notes(structure)]


def edge_eV(formula: str, substrate: str) -> float:
    """Strained edge on the catalogue's scale."""
    known = material(formula)
    return known.edge_eV + strain_on(known, material(substrate)).edge_shift_eV


def test_a_layer_is_strained() -> None:
    structure = structure_of(WELL + "thickness_ml = 20")
    layer, strain = structure.layers[0], strain_on(material("In0.2Ga0.8As"), material("GaAs"))
    assert structure.substrate == "GaAs"
    assert layer.strain == strain.in_plane
    assert layer.edge_shift_eV == strain.edge_shift_eV
    zero = material("GaAs").edge_eV
    assert layer.edge_eV == pytest.approx(edge_eV("In0.2Ga0.8As", "GaAs") - zero, abs=1e-14)
    assert layer.x_edge_eV == pytest.approx(material("In0.2Ga0.8As").x_edge_eV - zero, abs=1e-14)
    assert layer.monolayer_nm == strain.monolayer_nm
    assert layer.thickness_nm == pytest.approx(20 * strain.monolayer_nm)
    assert layer.lattice_nm == material("In0.2Ga0.8As").lattice_nm
    nu = poisson_ratio(material("In0.2Ga0.8As").elastic)
    assert layer.critical_nm == critical_thickness_nm(strain.in_plane, layer.lattice_nm, nu)


def test_the_zero_is_the_left_contacts_strained_edge() -> None:
    structure = structure_of(
        'material = "InP"\nthickness_nm = 3.0', substrate="InP", left="In0.6Ga0.4As", right="InAs"
    )
    zero = edge_eV("In0.6Ga0.4As", "InP")
    assert structure.left.edge_eV == 0.0
    assert structure.layers[0].edge_eV == pytest.approx(material("InP").edge_eV - zero, abs=1e-14)
    assert structure.right.edge_eV == pytest.approx(edge_eV("InAs", "InP") - zero, abs=1e-14)
    assert structure.layers[0].strain == 0.0
    assert structure.layers[0].critical_nm is None
    assert structure.right.critical_nm is not None


def test_the_gap_is_the_strained_one() -> None:
    """What `medium_of` gives is what layers and contacts are made of."""
    session = session_of(WELL + "thickness_nm = 5.0")
    found = medium_of("In0.2Ga0.8As", scale_of(session), ())
    assert found.gap_eV == strain_on(material("In0.2Ga0.8As"), material("GaAs")).gap_eV


def test_both_ends_of_a_grade_are_strained() -> None:
    structure = structure_of('material = "GaAs"\nto_material = "In0.2Ga0.8As"\nthickness_nm = 20.0')
    layer = structure.layers[0]
    zero, whole = material("GaAs").edge_eV, strain_on(material("In0.2Ga0.8As"), material("GaAs"))
    assert layer.edge_eV == 0.0
    expected = edge_eV("In0.2Ga0.8As", "GaAs") - zero
    assert layer.to_edge_eV == pytest.approx(expected, abs=1e-14)
    assert (layer.strain, layer.to_strain) == (0.0, whole.in_plane)
    assert layer.mean_strain == 0.5 * whole.in_plane
    assert structure.mean_strain == pytest.approx(layer.mean_strain)
    (note,) = texts(structure)
    assert "at its right face compressed by 1.41 %" in note


def test_without_a_substrate_nothing_moves() -> None:
    structure = structure_of(WELL + "thickness_ml = 20", substrate="")
    layer, known = structure.layers[0], material("In0.2Ga0.8As")
    assert structure.substrate == ""
    assert (layer.strain, layer.edge_shift_eV, layer.critical_nm) == (None, None, None)
    assert layer.edge_eV == known.edge_eV - material("GaAs").edge_eV
    assert layer.monolayer_nm == known.monolayer_nm
    (note,) = texts(structure)
    assert "the unstrained one: name the substrate in [growth]" in note


OWN = "[material.Mine]\nedge_eV = 0.2\nmass = 0.08\nmonolayer_nm = 0.3\n"


def test_what_is_stated_in_numbers_is_left_alone() -> None:
    plain = "edge_eV = 0.3\nmass = 0.09\nthickness_nm = 2.0"
    mine = 'material = "Mine"\nthickness_ml = 10'
    structure = structure_of(plain, mine, substrate="InP", left="InP", right="InP", own=OWN)
    first, second = structure.layers
    assert (first.edge_eV, first.strain) == (0.3, None)
    assert (second.edge_eV, second.strain, second.thickness_nm) == (0.2, None, 3.0)
    assert texts(structure) == ["taken as stated, whatever the strain: layers 1, 2"]


def test_notes_and_warnings() -> None:
    thin, thick = WELL + "thickness_nm = 5.0", WELL + "thickness_nm = 25.0"
    spacer = 'material = "GaAs"\nthickness_nm = 10.0'
    (note,) = texts(structure_of(spacer, thin, spacer, thin))
    assert note.startswith("layer 2 (In0.2Ga0.8As) is compressed by 1.41 %, its edge moved by +106")
    shifted, warning, whole = strain_notes(structure_of(spacer, thin, spacer, thick))
    assert shifted[1] == 2
    assert warning[1] == 4
    assert "25.00 nm thick; its critical thickness is 14.6 nm" in warning[0]
    assert whole[1] is None
    assert "the stack as a whole, 50.00 nm, is compressed by 0.85 % on average" in whole[0]


def test_a_balanced_stack_does_not_warn() -> None:
    """In0.64Ga0.36As is compressed on InP by what In0.42Ga0.58As is stretched, nearly."""
    wells = 'material = "In0.64Ga0.36As"\nthickness_nm = 8.0'
    barriers = 'material = "In0.42Ga0.58As"\nthickness_nm = 8.0'
    many = {"substrate": "InP", "left": "InP", "right": "InP"}
    said = texts(structure_of(*[wells, barriers] * 20, **many))
    assert [text.split(" ")[1] for text in said] == ["1", "2"]
    assert all("edge moved by" in text for text in said)
    (*_, whole) = texts(structure_of(*[wells, wells] * 20, **many))
    assert "balance it with layers of the opposite strain" in whole


def test_a_strained_contact_is_spoken_of() -> None:
    said = texts(structure_of('material = "GaAs"\nthickness_nm = 3.0', right="InAs"))
    (note,) = said
    assert note.startswith("right contact (InAs) is compressed by 6.69 %, its edge moved by")
    assert "its critical thickness is below two monolayers: a thick one relaxes" in note


def test_the_study_carries_the_notes() -> None:
    study = solve(Request(session_of(WELL + "thickness_nm = 25.0")))
    strains = [note for note in study.advice if note.topic == "strain"]
    assert [note.layer for note in strains] == [1, 1]
    assert all(isinstance(note, Advice) for note in strains)


@pytest.mark.parametrize(
    ("substrate", "own", "remedy"),
    [
        ("Unobtainium", "", "name the substrate by its formula, as InP"),
        ("AlGaAs", "", "name the substrate by its formula, as InP"),
        ("", "", "name the substrate by its formula, as InP"),
        ("Mine", OWN, "a material of one's own has no lattice constant"),
    ],
)
def test_an_unknown_substrate(substrate: str, own: str, remedy: str) -> None:
    text = text_of(WELL + "thickness_nm = 2.0", own=own)
    text = text.replace('substrate = "GaAs"', f'substrate = "{substrate}"')
    with pytest.raises(SessionError) as caught:
        resolve(read_session(text, "x.toml"))
    error = caught.value.located(text, "x.toml")
    assert str(error).startswith("x.toml, line 3: growth substrate is ")
    assert remedy in error.allowed
    assert "[material.NAME]" not in error.allowed


def test_a_gap_that_strain_closes_is_refused_where_it_stands() -> None:
    text = text_of('material = "InAs"\nthickness_nm = 2.0', substrate="InSb", left="InSb")
    with pytest.raises(SessionError) as caught:
        resolve(read_session(text, "x.toml"))
    error = caught.value.located(text, "x.toml")
    assert str(error).startswith("x.toml, line 7: layer 1 material is 'InAs'; its gap, strained to")


def test_undoing_the_substrate() -> None:
    session = session_of(WELL + "thickness_nm = 5.0")
    bare = resolve(replace(session, growth=Growth()))
    assert bare == structure_of(WELL + "thickness_nm = 5.0", substrate="")


def test_an_empty_table_names_none() -> None:
    text = text_of(WELL + "thickness_nm = 5.0", substrate="") + "[growth]\n"
    assert read_session(text, "x").growth == Growth()
