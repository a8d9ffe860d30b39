"""Sessions with a screened field: read, solved, reported and drawn."""

from __future__ import annotations

import json
from dataclasses import replace
from functools import lru_cache, partial

import numpy as np
import pytest

import tui.study
from physics.errors import StructureError
from physics.poisson import screened_field
from tui.command.entry import main
from tui.figures.cells import PLAIN
from tui.figures.energy_figure import base_figure, figure
from tui.reading import read_energy, read_level
from tui.report.objects import report_object
from tui.report.text import report_text
from tui.session.read import read_session
from tui.session.write import write_session
from tui.study import Request, Study, solve

TEXT = """\
format = 1
conditions = { temperature_K = 300, bias_V = 0.15, field = "screened" }
left = { material = "GaAs", donors_cm3 = 1e18 }
right = { material = "GaAs", donors_cm3 = 1e18 }
[[layer]]
material = "GaAs"
thickness_nm = 10
donors_cm3 = 1e17
[[layer]]
material = "Al0.3Ga0.7As"
thickness_nm = 3
[[layer]]
material = "GaAs"
thickness_nm = 6
[[layer]]
material = "Al0.3Ga0.7As"
thickness_nm = 3
[[layer]]
material = "GaAs"
thickness_nm = 10
"""


@lru_cache(maxsize=1)
def study() -> Study:
    return solve(Request(read_session(TEXT, "text"), max_width_eV=0.01))


def test_a_session_asks_for_the_model() -> None:
    session = read_session(TEXT, "text")
    assert (session.conditions.field, session.conditions.charge) == ("screened", "semi-classical")
    waves = replace(session, conditions=replace(session.conditions, charge="quantum"))
    for written in (write_session(waves), write_session(waves, TEXT)):
        assert read_session(written, "written") == waves
    assert "charge" not in write_session(session)


def test_the_answer_stands_on_the_bent_edge() -> None:
    screening = study().scene.screening
    assert screening is not None
    assert screening.converged
    assert study().reached
    assert study().profile.start_nm < 0.0
    assert study().profile.faces_nm == (0.0, 32.0)
    notes = [note.text for note in study().advice if note.topic == "screening"]
    assert len(notes) == 1
    assert "residual" in notes[0]
    assert "neutral" in notes[0]
    assert all(len(level.share_by_layer) == 5 for level in study().levels.levels)


def test_waves_are_asked_for_in_the_session() -> None:
    text = TEXT.replace('"screened"', '"screened", charge = "quantum"')
    scene = tui.study.set_scene(Request(read_session(text, "text")))
    assert scene.screening is not None
    assert "waves" in scene.screening.model


def test_what_did_not_converge_is_not_reached(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(tui.study, "screened_field", partial(screened_field, most_steps=1))
    lame = solve(Request(read_session(TEXT, "text"), from_eV=0.1, to_eV=0.2, max_width_eV=0.001))
    assert not lame.reached
    assert lame.levels.complete
    note = next(note for note in lame.advice if note.topic == "screening")
    assert "NOT CONVERGED" in note.text


def test_a_contact_without_a_fermi_energy_is_refused() -> None:
    plain = TEXT.replace(", donors_cm3 = 1e18", "")
    with pytest.raises(StructureError, match="screened field needs one"):
        solve(Request(read_session(plain, "text")))


def test_work_on_the_field_can_be_ended() -> None:
    class StaleError(Exception):
        pass

    def stop() -> None:
        raise StaleError

    with pytest.raises(StaleError):
        tui.study.set_scene(Request(read_session(TEXT, "text")), watch=stop)


def test_reports_say_each_layers_bent_edge() -> None:
    text = report_text(study(), "text")
    assert "screened field" in text
    layers = report_object(study())["layers"]
    assert len(layers) == 5
    at_face = study().profile.edge_eV(np.array([13.0]))[0]
    assert layers[2]["biased_left_edge_eV"] == at_face
    assert layers[0]["biased_left_edge_eV"] != 0.0


@pytest.mark.parametrize("width", [60, 140])
def test_the_figure_shows_the_contacts_beside_the_stack(width: int) -> None:
    base = base_figure(study(), width, 30, PLAIN)
    assert base.position.left == pytest.approx(-0.15 * 32.0)
    assert base.position.right == pytest.approx(1.15 * 32.0)
    # The far ends of the buffers are not smeared over the outermost columns.
    for column in (base.position_column, base.position_column + base.position_width - 1):
        rows = [n for n in range(base.rows) if base.cells.rows[n][column][1] == "edge"]
        assert len(rows) <= 2
    for reading in (read_energy(study(), 0.1), read_level(study(), 1)):
        assert "density" in {role for row in figure(base, reading).rows for _, role in row}


def test_the_command_line_answers(tmp_path, capsys: pytest.CaptureFixture[str]) -> None:  # type: ignore[no-untyped-def]
    path = tmp_path / "screened.toml"
    path.write_text(TEXT, encoding="utf-8")
    assert main(["report", str(path), "--max-width", "0.01", "--json"]) == 0
    result = json.loads(capsys.readouterr().out)
    assert result["conditions"]["field"] == "screened"
    assert "screening" in [note["topic"] for note in result["advice"]]
