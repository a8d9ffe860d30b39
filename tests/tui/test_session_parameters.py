"""Numbers of a session by name."""

from dataclasses import replace

import pytest

from tui.session.demo import demo_text
from tui.session.model import MaterialEntry
from tui.session.parameters import parameter, value_of, with_value
from tui.session.read import read_session
from tui.session.refusal import SessionError
from tui.session.resolve import resolve

DEMO = read_session(demo_text(), "demo")


@pytest.mark.parametrize(
    ("name", "value", "new"),
    [
        ("conditions bias_V", 0.0, 0.1),
        ("conditions temperature_K", 300.0, 77.0),
        ("left donors_cm3", 2e17, 1e18),
        ("layer 3 thickness_ml", 22.0, 23.0),
        ('layer "first barrier" thickness_ml', 10.0, 9.0),
        ("layer 2 composition", 0.4, 0.35),
        ("layer 2,4 composition", 0.4, 0.45),
    ],
)
def test_looked_up_and_changed(name: str, value: float, new: float) -> None:
    wanted = parameter(name, DEMO)
    assert value_of(wanted, DEMO) == value
    changed = with_value(wanted, DEMO, new)
    assert value_of(wanted, changed) == pytest.approx(new, rel=1e-12)
    assert value_of(wanted, DEMO) == value
    resolve(changed)
    assert with_value(wanted, changed, value) == DEMO


def test_layers_that_move_together() -> None:
    changed = with_value(parameter("layer 2,4 thickness_ml", DEMO), DEMO, 8.0)
    assert [layer.thickness_ml for layer in changed.layers[1:4:2]] == [8.0, 8.0]
    assert changed.layers[2] == DEMO.layers[2]


def test_a_number_takes_away_what_it_stands_against() -> None:
    changed = with_value(parameter("layer 3 thickness_nm", DEMO), DEMO, 6.0)
    assert changed.layers[2].thickness_ml is None
    assert resolve(changed).layers[2].thickness_nm == 6.0
    own = replace(DEMO, materials=(MaterialEntry("Mine", 0.2, 0.08),))
    wanted = parameter("material Mine edge_eV", own)
    assert with_value(wanted, own, 0.25).materials[0].edge_eV == 0.25


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("thickness", "write a table and a key"),
        ("layer thickness_nm", "name a layer from 1 to 5"),
        ("layer 9 thickness_nm", "numbered from 1 to 5"),
        ("layer 0 thickness_nm", "numbered from 1 to 5"),
        ('layer "none" thickness_nm', "no layer has that label"),
        ("layer 2 colour", "layer has "),
        ("conditions field", "conditions has "),
        ("conditions 2 bias_V", "only one table"),
        ("material Mine edge_eV", "own materials are"),
    ],
)
def test_refused_names(name: str, words: str) -> None:
    with pytest.raises(SessionError, match=words):
        parameter(name, DEMO)


def test_refused_values() -> None:
    with pytest.raises(SessionError, match="between 1e-6 and 1e5 nm"):
        with_value(parameter("layer 2 thickness_nm", DEMO), DEMO, 1e9)
    with pytest.raises(SessionError, match="does not state it"):
        value_of(parameter("layer 2 edge_eV", DEMO), DEMO)
    with pytest.raises(SessionError, match="an alloy of two fractions"):
        value_of(parameter("layer 3 composition", DEMO), DEMO)
    with pytest.raises(SessionError, match="between 0 and 1"):
        with_value(parameter("layer 2 composition", DEMO), DEMO, 1.0 + 1e-9)
