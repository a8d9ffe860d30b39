"""Results by name."""

import math

import pytest

from physics.levels import find_levels
from tui.outcome import evaluate, outcome
from tui.session.demo import demo_text
from tui.session.read import read_session
from tui.session.refusal import SessionError
from tui.study import Request, set_scene
from tui.sweep import SweepRequest, sweep

DEMO = read_session(demo_text() + "\n[sweep]\nto_V = 0.2\n", "demo")


def test_levels() -> None:
    names = ("level 1 energy_eV", "level 2 width_eV", "level 1 balance", "level 7 energy_eV")
    answer = evaluate(DEMO, [outcome(name) for name in names])
    scene = set_scene(Request(DEMO))
    first, second = find_levels(scene.profile, scene.from_eV, scene.to_eV).levels
    assert answer.values[:2] == (first.energy_eV, second.width_eV)
    assert answer.values[2] == pytest.approx(first.left_width_eV / first.right_width_eV, rel=1e-9)
    assert math.isnan(answer.values[3])
    assert answer.sweep is None
    assert answer.reached


def test_curves() -> None:
    names = ("peak bias_V", "peak_to_valley", "device voltage_swing_V", "device cutoff_Hz")
    answer = evaluate(DEMO, [outcome(name) for name in names])
    exact = sweep(SweepRequest(DEMO))
    assert exact.main is not None
    assert exact.figures is not None
    assert answer.values[0] == exact.main.peak.bias_V
    assert answer.values[1] == exact.main.peak_to_valley
    assert answer.values[2] == exact.figures.voltage_swing_V
    assert math.isnan(answer.values[3])
    assert answer.levels is None


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("level energy_eV", "write it as"),
        ("level 0 energy_eV", "write it as"),
        ("level 1 colour", "a level has"),
        ("peak colour", "write it as"),
        ("device colour", "write it as"),
        ("", "write it as"),
    ],
)
def test_refused(name: str, words: str) -> None:
    with pytest.raises(SessionError, match=words):
        outcome(name)
