"""What keys do to a session, without a screen."""

from __future__ import annotations

from dataclasses import replace

import pytest

from physics.band import masses_of
from physics.formula import parse_formula
from tui.session.demo import demo_text
from tui.session.model import LayerEntry, Session
from tui.session.read import read_session
from tui.session.resolve import resolve
from tui.session.write import write_session
from tui.workbench import stacking, values
from tui.workbench.form import rows_of
from tui.workbench.keys import KEYS, help_lines
from tui.workbench.sheet import Cursor, field_at, field_place, moved, sheet_height, sheet_lines
from tui.workbench.typed import Refusal, number

DEMO = read_session(demo_text(), "demo")
STRUCTURE = resolve(DEMO)
FIRST = ("layer", 1)


def typed(key: str, text: str, session: Session = DEMO) -> LayerEntry:
    changed = values.set_typed(session, FIRST, key, text, resolve(session))
    assert read_session(write_session(changed), "x") == changed
    return changed.layers[1]


def test_thickness_in_either_unit() -> None:
    assert typed("thickness_nm", "3.1").thickness_nm == 3.1
    assert typed("thickness_nm", "3.1").thickness_ml is None
    assert typed("thickness_nm", "11 ml").thickness_ml == 11.0
    assert typed("thickness_ml", "31 A").thickness_nm == 3.1


def test_an_edge_of_ones_own_takes_the_material_away_and_keeps_the_rest() -> None:
    layer = typed("edge_eV", "310 meV")
    assert (layer.material, layer.edge_eV, layer.mass) == (None, 0.31, STRUCTURE.layers[1].mass)
    assert layer.permittivity == STRUCTURE.layers[1].permittivity
    assert layer.thickness_nm == pytest.approx(STRUCTURE.layers[1].thickness_nm, rel=1e-8)
    back = typed("material", "AlAs", replace(DEMO, layers=(DEMO.layers[0], layer)))
    assert (back.material, back.edge_eV, back.mass) == ("AlAs", None, None)


def test_donors_and_fermi_energy_stand_against_each_other() -> None:
    session = values.set_typed(DEMO, ("left", 0), "fermi_eV", "54 meV", STRUCTURE)
    assert (session.left.fermi_eV, session.left.donors_cm3) == (0.054, None)
    assert values.set_typed(session, ("left", 0), "fermi_eV", "", None).left.fermi_eV is None


@pytest.mark.parametrize(
    ("key", "text", "word"),
    [
        ("thickness_nm", "0", "1e-6"),
        ("thickness_nm", "thick", "number"),
        ("thickness_nm", "", "needed"),
        ("thickness_nm", "3 kg", "unit kg"),
        ("thickness_nm", "1e999", "1e5 nm"),
        ("mass", "0", "mass lies"),
        ("label", "a\x1b", "control"),
        ("material", "", "needed"),
    ],
)
def test_what_is_not_taken(key: str, text: str, word: str) -> None:
    with pytest.raises(Refusal, match=word):
        values.set_typed(DEMO, FIRST, key, text, STRUCTURE)


def test_emptied_fields() -> None:
    assert typed("label", "").label == ""
    assert typed("donors_cm3", "").donors_cm3 == 0.0
    wide = values.set_typed(DEMO, ("view", 0), "from_eV", "-0.1", None)
    assert values.set_typed(wide, ("view", 0), "from_eV", " ", None) == DEMO


def test_steps() -> None:
    up = values.step(DEMO, FIRST, "thickness_ml", 1, structure=STRUCTURE)
    assert up.layers[1].thickness_ml == 11.0
    up = values.step(DEMO, FIRST, "thickness_nm", 1, structure=STRUCTURE)
    one = STRUCTURE.layers[1].monolayer_nm or 0.0
    assert up.layers[1].thickness_nm == pytest.approx(STRUCTURE.layers[1].thickness_nm + one)
    bias = values.step(DEMO, ("conditions", 0), "bias_V", -1)
    assert bias.conditions.bias_V == -0.01
    assert values.step(bias, ("conditions", 0), "bias_V", 1).conditions.bias_V == 0.0
    fine = values.step(DEMO, ("conditions", 0), "bias_V", 1, fine=True)
    assert fine.conditions.bias_V == 0.001
    doped = values.step(DEMO, FIRST, "donors_cm3", 1, structure=STRUCTURE)
    assert doped.layers[1].donors_cm3 == 1e16
    cold = replace(DEMO, conditions=replace(DEMO.conditions, temperature_K=5.0))
    with pytest.raises(Refusal, match="temperature"):
        values.step(cold, ("conditions", 0), "temperature_K", -1)
    with pytest.raises(Refusal, match="only numbers"):
        values.step(DEMO, FIRST, "label", 1)


@pytest.mark.parametrize(
    ("formula", "by", "stepped"),
    [
        ("Al0.3Ga0.7As", 0.01, "Al0.31Ga0.69As"),
        ("In.53Ga.47As", -0.001, "In0.529Ga0.471As"),
        ("GaAs0.51Sb0.49", 0.01, "GaAs0.52Sb0.48"),
    ],
)
def test_alloys_are_stepped(formula: str, by: float, stepped: str) -> None:
    assert values.stepped_formula(formula, by) == stepped
    before, after = parse_formula(formula), parse_formula(stepped)
    moved = [
        b[1] - a[1]
        for part in ("cations", "anions")
        for a, b in zip(getattr(before, part), getattr(after, part), strict=True)
    ]
    assert sorted(moved) == pytest.approx(sorted([abs(by), -abs(by), 0.0]))


@pytest.mark.parametrize(
    "formula", ["GaAs", "Al0.005Ga0.995As", "In0.53Ga0.2Al0.27As", "Al0.3Ga0.6As", "mine", ""]
)
def test_what_is_no_alloy_of_two_is_not_stepped(formula: str) -> None:
    with pytest.raises(Refusal, match="type"):
        values.stepped_formula(formula, -0.01)


def test_a_step_on_a_material_keeps_the_thickness() -> None:
    up = values.step(DEMO, FIRST, "material", 1, structure=STRUCTURE).layers[1]
    assert (up.material, up.thickness_ml) == ("Al0.41Ga0.59As", 10.0)


def test_layers_come_go_and_move() -> None:
    labels = [layer.label for layer in DEMO.layers]
    added = stacking.add_layer(DEMO, 1)
    assert [x.label for x in added.layers] == [*labels[:2], "", *labels[2:]]
    assert added.layers[2].material == DEMO.layers[1].material
    assert stacking.add_layer(DEMO, -1).layers[0].material == "GaAs"
    twice = stacking.duplicate_layer(DEMO, 2)
    assert twice.layers[2] == twice.layers[3] == DEMO.layers[2]
    assert stacking.delete_layer(twice, 3) == DEMO
    assert stacking.move_layer(stacking.move_layer(DEMO, 1, 1), 2, -1) == DEMO
    with pytest.raises(Refusal, match="end of the stack"):
        stacking.move_layer(DEMO, 0, -1)
    with pytest.raises(Refusal, match="at least one"):
        stacking.delete_layer(replace(DEMO, layers=DEMO.layers[:1]), 0)


def test_splitting_changes_no_edge() -> None:
    graded = values.set_typed(DEMO, FIRST, "to_material", "GaAs", STRUCTURE)
    for session in (DEMO, graded):
        before = resolve(session)
        after = resolve(stacking.split_layer(session, 1, before))
        assert len(after.layers) == len(before.layers) + 1
        assert after.thickness_nm == pytest.approx(before.thickness_nm, rel=1e-9)
        first, second = after.layers[1], after.layers[2]
        assert first.edge_eV == pytest.approx(before.layers[1].edge_eV)
        assert first.right_edge_eV == pytest.approx(second.edge_eV)
        assert second.right_edge_eV == pytest.approx(before.layers[1].right_edge_eV)


def test_mirroring_makes_the_stack_symmetric() -> None:
    session = replace(DEMO, layers=DEMO.layers[:3])
    session = values.set_typed(session, FIRST, "to_material", "Al0.1Ga0.9As", STRUCTURE)
    mirrored = resolve(stacking.mirror(session, 2, resolve(session)))
    assert len(mirrored.layers) == 5
    for left, right in zip(mirrored.layers, reversed(mirrored.layers), strict=True):
        assert left.thickness_nm == pytest.approx(right.thickness_nm)
        assert left.edge_eV == pytest.approx(right.right_edge_eV)
        assert left.right_mass == pytest.approx(right.mass)


def test_a_graded_layer_is_no_mirror() -> None:
    session = values.set_typed(DEMO, FIRST, "to_material", "GaAs", STRUCTURE)
    with pytest.raises(Refusal, match="graded"):
        stacking.mirror(session, 1, resolve(session))


def test_turning_twice_is_nothing() -> None:
    session = values.set_typed(DEMO, FIRST, "thickness_nm", "3.0", STRUCTURE)
    session = values.set_typed(session, FIRST, "to_material", "AlAs", STRUCTURE)
    once = stacking.turn_layer(session, 1, resolve(session))
    assert (once.layers[1].material, once.layers[1].to_material) == ("AlAs", "Al0.4Ga0.6As")
    assert stacking.turn_layer(once, 1, resolve(once)) == session
    with pytest.raises(Refusal, match="no grade"):
        stacking.turn_layer(DEMO, 0, STRUCTURE)


def test_typed_numbers() -> None:
    rule = values.TABLES["layer"]["edge_eV"]
    assert not isinstance(rule, str)
    for text, value in (("80 meV", 0.08), (" -.5", -0.5), ("1e-3eV", 1e-3), ("+2", 2.0)):
        assert number(text, "eV", rule) == value  # type: ignore[arg-type]


def test_the_cursor_stays_on_open_fields() -> None:
    rows = rows_of(DEMO, STRUCTURE)
    cursor = Cursor(0, 0)
    for down, right in [(1, 0)] * 9 + [(0, 1)] * 14 + [(-1, 0)] * 9 + [(0, -1)] * 14:
        cursor = moved(cursor, rows, down, right)
        assert field_at(cursor, rows).open
    assert cursor == Cursor(0, 0)


@pytest.mark.parametrize(("width", "height"), [(60, 5), (80, 8), (120, 30)])
def test_the_form_fits_and_shows_the_cursor(width: int, height: int) -> None:
    rows = rows_of(DEMO, STRUCTURE)
    for row in range(len(rows)):
        for column in range(len(rows[row].fields)):
            cursor = moved(Cursor(row, column), rows, 0, 0)
            lines = sheet_lines(rows, cursor, width, height)
            assert len(lines) <= height
            assert all(sum(len(text) for text, _ in line) <= width for line in lines)
            assert sum(role == "cursor" for line in lines for _, role in line) == 1
            line, start, length = field_place(lines) or (0, 0, 0)
            text = "".join(text for text, _ in lines[line])[start : start + length]
            field = field_at(cursor, rows)
            assert text.strip().rstrip("~") in field.text or row == 0


def test_rows_out_of_sight_are_counted() -> None:
    session = replace(DEMO, layers=DEMO.layers * 10)
    rows = rows_of(session, None)
    # The conditions take two lines, the heads one; of 52 rows 7 are seen.
    first = "".join(text for text, _ in sheet_lines(rows, Cursor(2, 2), 100, 10)[1])
    assert first.endswith("45 below")
    middle = "".join(text for text, _ in sheet_lines(rows, Cursor(26, 2), 80, 10)[1])
    above, below = (int(part[1:]) for part in middle.split()[-2:])
    assert above + below == 45


@pytest.mark.parametrize("height", [18, 24, 35, 50, 200])
def test_the_form_leaves_room_for_the_figure(height: int) -> None:
    few, many = rows_of(DEMO, None), rows_of(replace(DEMO, layers=DEMO.layers * 10), None)
    assert sheet_height(few, height, beside=False) <= len(few) + 1
    assert sheet_height(many, height, beside=False) <= max(5, 0.4 * height)
    assert sheet_height(many, height, beside=True) >= sheet_height(many, height, beside=False)


def test_every_key_is_listed_once() -> None:
    names = [name for key in KEYS for name in key.keys.split(",")]
    assert len(names) == len(set(names))
    text = "\n".join(help_lines())
    assert all(key.text in text for key in KEYS)


def test_an_edge_of_ones_own_keeps_the_materials_gap() -> None:
    layer = typed("edge_eV", "0.31")
    assert layer.gap_eV == STRUCTURE.layers[1].gap_eV
    assert typed("mass", "0.09").gap_eV == STRUCTURE.layers[1].gap_eV
    stated = typed("gap_eV", "1.7")
    assert (stated.material, stated.gap_eV) == ("Al0.4Ga0.6As", 1.7)
    back = replace(DEMO, layers=(DEMO.layers[0], stated))
    assert typed("material", "AlAs", back).gap_eV is None
    kane = replace(DEMO, conditions=replace(DEMO.conditions, band="kane"))
    resolve(values.set_typed(kane, FIRST, "edge_eV", "0.31", STRUCTURE))


def test_a_layer_like_its_neighbour_has_its_gap() -> None:
    session = values.set_typed(DEMO, FIRST, "edge_eV", "0.31", STRUCTURE)
    assert stacking.add_layer(session, 1).layers[2].gap_eV == STRUCTURE.layers[1].gap_eV


def test_halves_of_a_grade_have_the_masses_of_the_whole() -> None:
    kane = replace(DEMO, conditions=replace(DEMO.conditions, band="kane"))
    session = values.set_typed(kane, FIRST, "to_material", "GaAs", STRUCTURE)
    before = resolve(session)
    after = resolve(stacking.split_layer(session, 1, before))
    whole, halves = masses_of(before, "kane"), masses_of(after, "kane")
    middle = 0.5 * (whole.slope_left[1] + whole.slope_right[1])
    assert halves.slope_left[1] == pytest.approx(whole.slope_left[1])
    assert halves.slope_right[1] == pytest.approx(middle, rel=1e-8)
    assert halves.slope_left[2] == pytest.approx(middle, rel=1e-8)
    assert halves.slope_right[2] == pytest.approx(whole.slope_right[1])
    turned = resolve(stacking.turn_layer(session, 1, before)).layers[1]
    assert turned.gap_eV == before.layers[1].right_gap_eV
    own = resolve(values.set_typed(session, FIRST, "to_edge_eV", "0.1", before)).layers[1]
    assert own.right_gap_eV == before.layers[1].right_gap_eV


def test_models_are_stepped_round() -> None:
    place = ("conditions", 0)
    kane = values.step(DEMO, place, "band", 1)
    assert kane.conditions.band == "kane"
    assert values.step(kane, place, "band", 1) == DEMO
    assert values.step(DEMO, place, "band", -1).conditions.band == "kane"
    for key, choices in values.CHOICES.items():
        seen = DEMO
        for _ in choices:
            seen = values.step(seen, place, key, 1)
        assert seen == DEMO
    assert values.set_typed(DEMO, place, "band", "kane", None) == kane
    with pytest.raises(Refusal, match="parabolic, kane"):
        values.set_typed(DEMO, place, "band", "flat", None)
    with pytest.raises(Refusal, match="needed"):
        values.set_typed(DEMO, place, "band", "", None)


def test_coherence_is_stated_in_one_way() -> None:
    place = ("conditions", 0)
    timed = values.set_typed(DEMO, place, "scattering_time_s", "0.2 ps", None)
    assert timed.conditions.scattering_time_s == 0.2e-12
    assert "scatter. s" in [field.head for field in rows_of(timed, None)[0].fields]
    wide = values.set_typed(timed, place, "dephasing_eV", "2 meV", None)
    assert (wide.conditions.dephasing_eV, wide.conditions.scattering_time_s) == (0.002, None)
    assert values.set_typed(wide, place, "dephasing_eV", "", None) == DEMO


def test_gaps_are_shown_where_they_matter() -> None:
    def heads(session: Session) -> list[str]:
        return [field.head for field in rows_of(session, resolve(session))[2].fields]

    assert "gap eV" not in heads(DEMO)
    kane = values.step(DEMO, ("conditions", 0), "band", 1)
    assert "gap eV" in heads(kane)
    row = rows_of(kane, resolve(kane))[3]
    shown = next(field for field in row.fields if field.key == "gap_eV")
    assert (shown.text, shown.stated) == (f"{resolve(kane).layers[1].gap_eV:.4f}", False)


def test_range_and_device() -> None:
    session = values.set_typed(DEMO, ("sweep", 0), "to_V", "600 mV", None)
    session = values.set_typed(session, ("device", 0), "mesa_um2", "4 um2", None)
    session = values.set_typed(session, ("device", 0), "parallel_fF", "0.1 pF", None)
    session = values.step(session, ("device", 0), "mesa_um2", 1)
    assert (session.sweep.to_V, session.device.mesa_um2) == (0.6, 5.0)
    assert session.device.parallel_fF == 100.0
    assert read_session(write_session(session), "x") == session
    texts = [field.text for field in rows_of(session, None, of_current=True)[0].fields]
    assert texts[4:9] == ["auto", "0.6", "5", "-", "100"]


def test_conditions_break_into_lines_around_the_cursor() -> None:
    rows = rows_of(DEMO, None, of_current=True)
    for column in range(len(rows[0].fields)):
        lines = sheet_lines(rows, Cursor(0, column), 60, 8)
        assert sum(role == "cursor" for line in lines[:2] for _, role in line) == 1
        assert len(lines) == 8
        text = "".join(text for line in lines[:2] for text, _ in line)
        assert (">" in text) or ("<" in text)
