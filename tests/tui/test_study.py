"""The core request: its window, its defaults, its refusals."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from physics.errors import EnergyError
from physics.field import uniform_field
from tui.reading import read_level
from tui.session.demo import demo_text
from tui.session.model import ContactEntry, LayerEntry, Session, View
from tui.session.read import read_session
from tui.session.refusal import SessionError
from tui.session.resolve import resolve
from tui.study import Request, energy_window, scatter_scene, set_scene, solve

DEMO = read_session(demo_text(), "demo")
PLAIN = ContactEntry(edge_eV=0.0, mass=0.067)


def stack(*edges_eV: float, right_eV: float = 0.0) -> Session:
    layers = tuple(LayerEntry(edge_eV=edge, mass=0.09, thickness_nm=2.0) for edge in edges_eV)
    return Session(left=PLAIN, layers=layers, right=replace(PLAIN, edge_eV=right_eV))


def window(session: Session) -> tuple[float, float]:
    return energy_window(uniform_field(resolve(session), session.conditions.bias_V))


def test_the_window_reaches_from_the_lowest_to_the_highest_edge() -> None:
    assert window(stack(0.3, -0.1, 0.25)) == (-0.1, 0.3)
    assert window(stack(0.1, right_eV=0.4)) == (0.0, 0.4)


def test_a_flat_stack_has_a_window_all_the_same() -> None:
    assert window(stack(0.0)) == (0.0, 0.5)
    low, high = window(stack(5e-4))
    assert (low, high) == (0.0, pytest.approx(0.5005))


def test_bias_moves_the_window() -> None:
    biased = stack(0.3)
    biased = replace(biased, conditions=replace(biased.conditions, bias_V=0.2))
    assert window(biased) == pytest.approx((-0.2, 0.3))


def test_the_request_comes_before_the_view_and_the_view_before_the_edges() -> None:
    session = replace(stack(0.3), view=View(0.05, None, 0.02))
    scene = set_scene(Request(session))
    assert (scene.from_eV, scene.to_eV, scene.max_width_eV) == (0.05, 0.3, 0.02)
    scene = set_scene(Request(session, 0.1, 0.2, 0.01))
    assert (scene.from_eV, scene.to_eV, scene.max_width_eV) == (0.1, 0.2, 0.01)


def test_an_empty_window_is_refused_with_the_edges() -> None:
    with pytest.raises(EnergyError, match=r"from 0\.4 to 0\.3 eV is empty.*from 0 to 0\.3 eV"):
        set_scene(Request(stack(0.3), from_eV=0.4))


def test_one_energy_is_a_window_for_transmission_but_holds_no_levels() -> None:
    request = Request(stack(0.3), 0.1, 0.1)
    assert set_scene(request).from_eV == 0.1
    with pytest.raises(EnergyError, match="empty"):
        solve(request)


def test_the_answer_hangs_together() -> None:
    study = solve(Request(DEMO))
    assert study.reached
    assert study.levels.counted == len(study.levels.levels) > 0
    assert (study.levels.from_eV, study.levels.to_eV) == (study.scene.from_eV, study.scene.to_eV)
    energies = study.spectrum.energy_eV
    assert (energies[0], energies[-1]) == (study.scene.from_eV, study.scene.to_eV)
    assert "coherence" in [note.topic for note in study.advice]


def test_work_that_is_watched_can_be_ended() -> None:
    class StaleError(Exception):
        pass

    def stop() -> None:
        raise StaleError

    with pytest.raises(StaleError):
        solve(Request(DEMO), watch=stop)


def kane(session: Session) -> Session:
    return replace(session, conditions=replace(session.conditions, band="kane"))


def test_the_band_reaches_the_answer() -> None:
    plain, grown = (solve(Request(session)).levels.levels for session in (DEMO, kane(DEMO)))
    assert 1e-4 < abs(plain[0].energy_eV - grown[0].energy_eV) < 0.01
    assert not set_scene(Request(kane(DEMO))).profile.is_parabolic


def test_the_window_begins_above_valence_bands() -> None:
    """A contact's mass vanishes at 0.6 - 0.4 eV; what is asked for below is refused."""
    contact = ContactEntry(edge_eV=0.6, mass=0.03, gap_eV=0.4)
    well = LayerEntry(edge_eV=0.0, mass=0.05, thickness_nm=5.0, gap_eV=1.0)
    session = kane(Session(left=contact, layers=(well,), right=contact))
    scene = set_scene(Request(session))
    assert (scene.from_eV, scene.to_eV) == (pytest.approx(0.201), 0.6)
    assert solve(Request(session)).reached
    with pytest.raises(EnergyError, match=r"left: 0\.1 eV lies in its valence band"):
        solve(Request(session, from_eV=0.1))


def losing(**stated: float) -> Session:
    return replace(DEMO, conditions=replace(DEMO.conditions, **stated))


def test_lost_coherence_lowers_the_peak_and_leaves_the_rest() -> None:
    coherent, lost = solve(Request(DEMO)), solve(Request(losing(dephasing_eV=5e-3)))
    assert lost.levels == coherent.levels
    assert (coherent.scene.dephasing_eV, lost.scene.dephasing_eV) == (0.0, 5e-3)
    before, after = read_level(coherent, 1), read_level(lost, 1)
    assert after.transmission < 0.6 * before.transmission
    assert after.dwell_time_s == before.dwell_time_s
    at = lost.spectrum.energy_eV
    assert scatter_scene(lost.scene, at).transmission == pytest.approx(
        lost.spectrum.transmission, rel=1e-9
    )
    assert np.abs(lost.spectrum.transmission + lost.spectrum.reflection - 1.0).max() < 1e-15
    assert "5 meV of lost coherence" in " ".join(note.text for note in lost.advice)


def test_ways_to_state_it_agree() -> None:
    """hbar over 0.1 ps is 6.582 meV (CODATA 2022)."""
    width = set_scene(Request(losing(scattering_time_s=1e-13))).dephasing_eV
    assert width == pytest.approx(6.582119569e-3, rel=1e-9)
    both = losing(scattering_time_s=1e-13, dephasing_eV=6.5821196e-3)
    assert set_scene(Request(both)).dephasing_eV == 6.5821196e-3
    mass = resolve(DEMO).left.mass
    mobility = 1e-13 / (1e-4 * mass * 9.1093837e-31 / 1.602176634e-19)
    scene = set_scene(Request(losing(mobility_cm2_Vs=mobility)))
    assert scene.dephasing_eV == pytest.approx(width, rel=1e-7)
    assert set_scene(Request(losing(dephasing_eV=0.0))).dephasing_eV == 0.0


@pytest.mark.parametrize(
    ("stated", "key", "said"),
    [
        (
            {"dephasing_eV": 1e-3, "scattering_time_s": 1e-12},
            "scattering_time_s",
            "keep one of the two, scattering_time_s or dephasing_eV",
        ),
        (
            {"dephasing_eV": 0.0, "mobility_cm2_Vs": 8000.0},
            "mobility_cm2_Vs",
            "keep one of the two, mobility_cm2_Vs or dephasing_eV",
        ),
        ({"mobility_cm2_Vs": 1.0}, "mobility_cm2_Vs", "a dephasing width lies between"),
    ],
)
def test_what_disagrees_is_refused(stated: dict[str, float], key: str, said: str) -> None:
    with pytest.raises(SessionError, match=said) as caught:
        set_scene(Request(losing(**stated)))
    assert caught.value.key == f"conditions {key}"
    assert caught.value.path == ("conditions", key)
