"""What scripts read: headers, keys and numbers of every command, exactly (schema 1).

A change here breaks a reader and raises the schema.
"""

from __future__ import annotations

import csv
import io
import itertools
import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from physics.scattering import scatter
from tui.command.entry import main
from tui.session.demo import demo_text
from tui.session.read import read_session
from tui.session.write import write_session
from tui.study import Request, set_scene, solve

DEMO = read_session(demo_text(), "demo")
HEAD = ["schema", "command", "title", "conditions"]
LOST = ["dephasing_eV", "scattering_time_s", "mobility_cm2_Vs"]
CONDITIONS = ["temperature_K", "bias_V", "field", "charge", "band", *LOST]
SPECTRUM = ["energy_eV", "transmission", "log10_transmission", "reflection"]
IV = [
    "bias_V",
    "current_density_A_per_cm2",
    "error_A_per_cm2",
    "conductance_S_per_cm2",
    "reached",
    "peak",
    "valley",
    "peak_to_valley",
    "onset_V",
    "regions",
    "levels",
    "figures",
    "notes",
]
LEVEL = [
    "number",
    "energy_eV",
    "width_eV",
    "log10_width_eV",
    "left_width_eV",
    "right_width_eV",
    "lifetime_s",
    "peak_transmission",
    "kind",
    "nodes",
    "share_by_layer",
    "width_error",
    "main_layer",
    "main_layer_share",
]
LEVELS = ["levels", "complete", "counted", "accurate", "from_eV", "to_eV", "max_width_eV"]
PROFILE = ["x_nm", "edge_eV", "density_per_nm", "norm", "energy_eV", "level"]
LEVELS_CSV = (
    "level,energy_eV,width_eV,lifetime_s,left_width_eV,right_width_eV,peak_transmission,kind,"
    "nodes,main_layer,main_layer_share,log10_width_eV,width_error"
)
CLOSED = """\
format = 1
left = { edge_eV = 0.3, mass = 0.09 }
right = { edge_eV = 0.3, mass = 0.09 }
layer = [ { edge_eV = 0.0, mass = 0.067, thickness_nm = 5.0 } ]
"""

TWIN_WELLS = """\
format = 1
left = { edge_eV = 0.0, mass = 0.067 }
right = { edge_eV = 0.0, mass = 0.067 }
layer = [
  { edge_eV = 0.3, mass = 0.092, thickness_nm = 4.0 },
  { edge_eV = 0.0, mass = 0.067, thickness_nm = 8.0 },
  { edge_eV = 0.3, mass = 0.092, thickness_nm = 30.0 },
  { edge_eV = 0.0, mass = 0.067, thickness_nm = 8.0 },
  { edge_eV = 0.3, mass = 0.092, thickness_nm = 4.0 },
]
"""
"""Two like wells so far apart that their levels share one double: widths mix beyond 1e-6."""


@pytest.fixture
def design(tmp_path: Path) -> str:
    path = tmp_path / "design.toml"
    path.write_text(demo_text(), encoding="utf-8")
    return str(path)


def printed(capsys: pytest.CaptureFixture[str], *arguments: str, status: int = 0) -> str:
    assert main(arguments) == status
    return capsys.readouterr().out


def as_json(capsys: pytest.CaptureFixture[str], *arguments: str) -> dict[str, Any]:
    text = printed(capsys, *arguments, "--json")
    assert "NaN" not in text
    assert "Infinity" not in text
    result: dict[str, Any] = json.loads(text)
    assert list(result)[:4] == HEAD
    assert list(result["conditions"]) == CONDITIONS
    return result


@pytest.mark.parametrize(
    ("arguments", "keys"),
    [
        (["spectrum", "--points", "3"], SPECTRUM),
        (["spectrum"], [*SPECTRUM, "advice", "levels_complete"]),
        (["levels"], [*LEVELS, "advice"]),
        (["profile"], PROFILE),
        (["profile", "--energy", "0.1"], PROFILE),
        (["report"], ["left", "layers", "right", *LEVELS, "spectrum", "advice", "current"]),
        (["iv", "--points", "5"], IV),
    ],
)
def test_keys(
    arguments: list[str], keys: list[str], capsys: pytest.CaptureFixture[str], design: str
) -> None:
    result = as_json(capsys, arguments[0], design, *arguments[1:])
    assert list(result) == [*HEAD, *keys]
    assert (result["schema"], result["command"]) == (1, arguments[0])
    said = {"temperature_K": 300.0, "bias_V": 0.0, "field": "uniform"}
    said |= {"charge": "semi-classical", "band": "parabolic"}
    assert result["conditions"] == said | dict.fromkeys(LOST)


def test_keys_within(capsys: pytest.CaptureFixture[str], design: str) -> None:
    report = as_json(capsys, "report", design)
    assert [list(level) for level in report["levels"]] == [LEVEL, LEVEL]
    assert list(report["spectrum"]) == SPECTRUM
    assert {tuple(note) for note in report["advice"]} == {("topic", "text", "layer")}
    assert {"edge_eV", "mass", "fermi_eV", "biased_edge_eV"} <= set(report["left"])
    assert [layer["number"] for layer in report["layers"]] == [1, 2, 3, 4, 5]
    biased = {"biased_left_edge_eV", "biased_right_edge_eV"}
    assert biased | {"thickness_nm", "edge_eV", "mass", "label"} <= set(report["layers"][0])
    assert report["levels"] == as_json(capsys, "levels", design)["levels"]
    assert report["spectrum"]["energy_eV"] == as_json(capsys, "spectrum", design)["energy_eV"]


@pytest.mark.parametrize(
    ("arguments", "header"),
    [
        (["spectrum", "--points", "3"], ",".join(SPECTRUM)),
        (["spectrum"], ",".join(SPECTRUM)),
        (["levels"], LEVELS_CSV),
        (["levels", "--to", "0.01"], LEVELS_CSV),  # no level: the header all the same
        (["profile"], "x_nm,edge_eV,density_per_nm"),
    ],
)
def test_headers(
    arguments: list[str], header: str, capsys: pytest.CaptureFixture[str], design: str
) -> None:
    text = printed(capsys, arguments[0], design, *arguments[1:])
    assert text.startswith(header + "\n")
    assert text.endswith("\n")
    assert "\r" not in text
    table = list(csv.reader(io.StringIO(text)))
    assert {len(row) for row in table} == {header.count(",") + 1}


def test_every_number_comes_back_as_it_was(capsys: pytest.CaptureFixture[str], design: str) -> None:
    scene = set_scene(Request(DEMO))
    energies = np.linspace(0.02, 0.3, 17)
    exact = scatter(scene.profile, energies)
    window = ["--from", "0.02", "--to", "0.3", "--points", "17"]
    table = csv.DictReader(io.StringIO(printed(capsys, "spectrum", design, *window)))
    rows = list(table)
    result = as_json(capsys, "spectrum", design, *window)
    for name in SPECTRUM:
        assert [float(row[name]) for row in rows] == getattr(exact, name).tolist() == result[name]
    level = as_json(capsys, "levels", design)["levels"][0]
    found = solve(Request(DEMO)).levels.levels[0]
    assert level["width_eV"] == found.width_eV
    assert level["share_by_layer"] == list(found.share_by_layer)


def test_one_point(capsys: pytest.CaptureFixture[str], design: str) -> None:
    for to in ("0.1", "0.2"):  # the lower end, then
        window = ["--from", "0.1", "--to", to, "--points", "1"]
        assert as_json(capsys, "spectrum", design, *window)["energy_eV"] == [0.1]


def test_null_where_a_number_cannot_be_said(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    path = tmp_path / "closed.toml"
    path.write_text(CLOSED)
    window = ["--from", "0.1", "--to", "0.2", "--points", "2"]
    result = as_json(capsys, "spectrum", str(path), *window)
    assert result["transmission"] == [0.0, 0.0]
    assert result["log10_transmission"] == [None, None]
    text = printed(capsys, "spectrum", str(path), *window)
    assert text.split("\n")[1:3] == ["0.1,0.0,,1.0", "0.2,0.0,,1.0"]
    level = as_json(capsys, "levels", str(path))["levels"][0]
    assert (level["lifetime_s"], level["log10_width_eV"]) == (None, None)


@pytest.mark.parametrize("command", ["spectrum", "levels", "profile", "report"])
def test_overrides_are_as_if_they_stood_in_the_file(
    command: str, capsys: pytest.CaptureFixture[str], design: str, tmp_path: Path
) -> None:
    there = tmp_path / "there.toml"
    conditions = replace(DEMO.conditions, bias_V=-1e-3, temperature_K=77.0)
    there.write_text(write_session(replace(DEMO, conditions=conditions), demo_text()))
    plain = as_json(capsys, command, str(there))
    for bias in (["--bias", "-1e-3"], ["--bias=-1e-3"], ["--bias", "-.001"]):
        options = [*bias, "--temperature", "77"]
        assert as_json(capsys, command, design, *options) == plain
        assert as_json(capsys, *[command, *options, design]) == plain
    assert as_json(capsys, command, design)["conditions"] != plain["conditions"]


NUMBERS = ["--from", "--to", "--max-width", "--bias", "--temperature"]
BAD_NUMBERS = ["nan", "inf", "1e999", "-1e999", "x", "", "-", "--json", "1,5", "0x10", "\x1b[2J"]


@pytest.mark.parametrize("option", NUMBERS)
def test_no_number_is_refused_by_its_name(
    option: str, capsys: pytest.CaptureFixture[str], design: str
) -> None:
    for value in BAD_NUMBERS:
        assert main(["levels", design, option, value]) == 2
        said = capsys.readouterr()
        assert said.out == ""
        assert said.err.startswith(f"winze: levels: argument {option}: ")
        assert said.err.count("\n") == 1
        assert "\x1b" not in said.err


@pytest.mark.parametrize("points", ["0", "-1", "1.5", "1e3", "", "10000001", "9" * 5000, "²", "٣"])
def test_no_count_is_refused(points: str, capsys: pytest.CaptureFixture[str], design: str) -> None:
    assert main(["spectrum", design, f"--points={points}"]) == 2
    assert "a whole number from 1 to" in capsys.readouterr().err


def test_a_result_never_takes_the_session_s_place(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    """-o on the design itself, by its name, a link or another way there."""
    path, link, twin = tmp_path / "a.toml", tmp_path / "link", tmp_path / "twin"
    path.write_text(demo_text(), encoding="utf-8")
    link.symlink_to(path)
    twin.hardlink_to(path)
    names = [str(path), str(link), str(twin), str(tmp_path / "." / ".." / tmp_path.name / "a.toml")]
    for command, (file, target) in itertools.product(
        ("levels", "spectrum", "profile", "report"), itertools.permutations(names, 2)
    ):
        assert main([command, file, "-o", target]) == 2
        said = capsys.readouterr()
        assert "-o names the session text itself" in said.err
        assert said.out == ""
    assert path.read_text(encoding="utf-8") == demo_text()


def test_output_is_all_or_nothing(
    capsys: pytest.CaptureFixture[str], design: str, tmp_path: Path
) -> None:
    target = tmp_path / "out.csv"
    target.write_text("old")
    assert main(["levels", design, "--from", "0.3", "--to", "0.1", "-o", str(target)]) == 2
    assert target.read_text() == "old"
    assert main(["levels", design, "-o", str(target)]) == 0
    assert target.read_text().startswith(LEVELS_CSV)
    assert capsys.readouterr().out == ""
    for nowhere in (str(tmp_path), str(tmp_path / "no" / "x"), f"{design}/x", "a" * 5000, ""):
        assert main(["levels", design, "-o", nowhere]) == 2
        assert "it cannot be written" in capsys.readouterr().err


@pytest.mark.parametrize("command", ["levels", "spectrum", "report", "profile"])
def test_an_accuracy_that_is_not_reached_is_said_with_the_answer(
    command: str, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    path = tmp_path / "twin.toml"
    path.write_text(TWIN_WELLS)
    result = json.loads(printed(capsys, command, str(path), "--json", status=3))
    assert set(HEAD) < set(result)
    if command in {"levels", "report"}:
        assert (result["complete"], result["counted"], result["accurate"]) == (True, 4, False)
        assert result["levels"][0]["width_error"] > 1e-6
    target = tmp_path / "out"
    assert main([command, str(path), "-o", str(target)]) == 3
    assert target.read_text()
    # a window without the two: the answer is exact again
    assert printed(capsys, command, str(path), "--from", "0.1", status=0)
