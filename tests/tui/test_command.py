"""The command line as scripts use it: in processes of its own, and in this one."""

from __future__ import annotations

import csv
import io
import json
import math
import os
import pty
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

from tui.command.entry import main
from tui.session.demo import demo_text

WINZE = [sys.executable, "-m", "tui.command.entry"]
TOP = Path(__file__).parents[2]
UNPROVED = """\
format = 1
title = "long spacers, all but like the contacts"
left = { edge_eV = 0.0, mass = 0.067 }
right = { edge_eV = 0.0, mass = 0.067 }
layer = [
  { edge_eV = 0.0, mass = 0.06700001, thickness_nm = 300.0 },
  { edge_eV = 0.3, mass = 0.092, thickness_nm = 2.0 },
  { edge_eV = 0.0, mass = 0.067, thickness_nm = 5.0 },
  { edge_eV = 0.3, mass = 0.092, thickness_nm = 2.0 },
  { edge_eV = 0.0, mass = 0.06700001, thickness_nm = 300.0 },
]
"""
BOUND = """\
format = 1
left = { edge_eV = 0.3, mass = 0.09 }
right = { edge_eV = 0.3, mass = 0.09 }
layer = [ { edge_eV = 0.0, mass = 0.067, thickness_nm = 5.0 } ]
"""


def winze(
    *arguments: str, text: str | bytes = "", **environment: str
) -> subprocess.CompletedProcess[bytes]:
    data = text.encode() if isinstance(text, str) else text
    return subprocess.run(
        [*WINZE, *arguments],
        input=data,
        capture_output=True,
        timeout=60,
        check=False,
        cwd=TOP,
        env=os.environ | environment,
    )


@pytest.fixture
def design(tmp_path: Path) -> str:
    path = tmp_path / "design.toml"
    path.write_text(demo_text(), encoding="utf-8")
    return str(path)


def answer(capsys: pytest.CaptureFixture[str], *arguments: str) -> str:
    assert main(arguments) == 0
    return capsys.readouterr().out


def as_json(capsys: pytest.CaptureFixture[str], *arguments: str) -> dict[str, Any]:
    def no_constant(name: str) -> None:
        raise AssertionError(name)

    result = json.loads(answer(capsys, *arguments, "--json"), parse_constant=no_constant)
    assert result["schema"] == 1
    assert result["command"] == arguments[0]
    assert set(result["conditions"]) >= {"temperature_K", "bias_V", "field"}
    return dict(result)


def rows(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text)))


def test_spectrum(capsys: pytest.CaptureFixture[str], design: str) -> None:
    text = answer(capsys, "spectrum", design, "--from", "0", "--to", "0.2", "--points", "5")
    assert text.split("\n")[0] == "energy_eV,transmission,log10_transmission,reflection"
    table = rows(text)
    assert [float(row["energy_eV"]) for row in table] == pytest.approx([0, 0.05, 0.1, 0.15, 0.2])
    assert table[0]["log10_transmission"] == ""  # T = 0 at the contact's edge has no logarithm
    for row in table[1:]:
        t = float(row["transmission"])
        assert t + float(row["reflection"]) == pytest.approx(1.0, abs=1e-12)
        assert math.log10(t) == pytest.approx(float(row["log10_transmission"]), abs=1e-12)
    result = as_json(capsys, "spectrum", design, "--from=0", "--to=0.2", "--points", "5")
    assert result["transmission"] == [float(row["transmission"]) for row in table]
    assert result["log10_transmission"][0] is None


def test_spectrum_without_points_meets_the_levels(
    capsys: pytest.CaptureFixture[str], design: str
) -> None:
    result = as_json(capsys, "spectrum", design)
    levels = as_json(capsys, "levels", design)["levels"]
    for level in levels:
        assert min(abs(e - level["energy_eV"]) for e in result["energy_eV"]) < 1e-12
    assert max(result["transmission"]) > 0.999
    assert result["levels_complete"] is True


def test_levels(capsys: pytest.CaptureFixture[str], design: str) -> None:
    result = as_json(capsys, "levels", design)
    table = rows(answer(capsys, "levels", design))
    assert result["complete"] is True
    assert result["counted"] == len(result["levels"]) == len(table) == 2
    wanted = {
        "energy_eV",
        "width_eV",
        "lifetime_s",
        "left_width_eV",
        "right_width_eV",
        "peak_transmission",
        "kind",
    }
    for level, row in zip(result["levels"], table, strict=True):
        assert wanted <= set(level)
        assert wanted <= set(row)
        assert level["kind"] == row["kind"] == "quasi-bound"
        assert level["width_eV"] == float(row["width_eV"])
        assert level["lifetime_s"] * level["width_eV"] == pytest.approx(6.582119569e-16)
    narrow = as_json(capsys, "levels", design, "--max-width", "0.005")
    assert narrow["counted"] == 1
    assert as_json(capsys, "levels", design, "--from", "0.1", "--to", "0.2")["levels"] == []


def test_bound_levels_have_no_lifetime(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    path = tmp_path / "well.toml"
    path.write_text(BOUND)
    level = as_json(capsys, "levels", str(path))["levels"][0]
    assert (level["kind"], level["width_eV"], level["lifetime_s"]) == ("bound", 0.0, None)
    assert rows(answer(capsys, "levels", str(path)))[0]["lifetime_s"] == ""


def test_overrides(capsys: pytest.CaptureFixture[str], design: str) -> None:
    plain = as_json(capsys, "levels", design)
    biased = as_json(capsys, "levels", design, "--bias", "-0.05", "--temperature", "4")
    assert biased["conditions"]["bias_V"] == -0.05
    assert biased["conditions"]["temperature_K"] == 4.0
    assert biased["levels"][0]["energy_eV"] > plain["levels"][0]["energy_eV"]


def test_profile(capsys: pytest.CaptureFixture[str], design: str) -> None:
    text = answer(capsys, "profile", design, "--energy", "0.1")
    assert text.split("\n")[0] == "x_nm,edge_eV,density_per_nm"
    result = as_json(capsys, "profile", design, "--energy", "0.1")
    assert result["norm"] == "incident from the left"
    assert result["x_nm"][0] == 0.0
    assert len(result["x_nm"]) == len(result["edge_eV"]) == len(result["density_per_nm"])
    second = as_json(capsys, "profile", design, "--level", "2")
    assert (second["norm"], second["level"]) == ("one electron in the stack", 2)
    assert as_json(capsys, "profile", design)["level"] == 1


def test_report(capsys: pytest.CaptureFixture[str], design: str) -> None:
    text = answer(capsys, "report", design)
    for part in ("Kestrel Ridge", "Stack", "Levels from", "complete", "Transmission", "Notes"):
        assert part in text
    assert text.isascii()
    result = as_json(capsys, "report", design)
    assert {"left", "layers", "right", "levels", "spectrum", "advice"} <= set(result)


def test_output_to_a_file(capsys: pytest.CaptureFixture[str], design: str, tmp_path: Path) -> None:
    target = tmp_path / "levels.csv"
    assert answer(capsys, "levels", design, "-o", str(target)) == ""
    assert target.read_text() == answer(capsys, "levels", design, "-o", "-")


def test_example_is_a_session(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    path = tmp_path / "x.toml"
    assert answer(capsys, "example", "-o", str(path)) == ""
    assert path.read_text(encoding="utf-8") == demo_text()


def test_negative_numbers_in_any_spelling(capsys: pytest.CaptureFixture[str], design: str) -> None:
    for start in (["--from", "-1e-3"], ["--from=-1e-3"], ["--from", "-.001"]):
        text = answer(capsys, "spectrum", design, *start, "--to", "0.1", "--points", "2")
        assert float(rows(text)[0]["energy_eV"]) == -1e-3


def test_standard_input_and_status() -> None:
    done = winze("levels", "-", text=demo_text())
    assert done.returncode == 0
    assert done.stdout.startswith(b"level,energy_eV,")
    assert b"note: coherence" in done.stderr


@pytest.mark.parametrize(
    "arguments",
    [
        ["levels"],
        ["levels", "/nowhere/x.toml"],
        ["levels", "/"],
        ["nonsense", "x"],
        ["levels", "-", "--bias", "nan"],
        ["levels", "-", "--bias", "1e999"],
        ["levels", "-", "--from", "0.3", "--to", "0.1"],
        ["spectrum", "-", "--points", "0"],
        ["spectrum", "-", "--points", "1.5"],
        ["profile", "-", "--level", "99"],
        ["profile", "-", "--energy", "-0.3"],
        ["profile", "-", "--level", "1", "--energy", "0.1"],
        ["levels", "-", "-o", "/nowhere/x.csv"],
        ["/nowhere/x.toml"],
        [],
    ],
)
def test_wrong_calls(arguments: list[str]) -> None:
    done = winze(*arguments, text=demo_text())
    assert done.returncode == 2
    assert done.stdout == b""
    assert b"winze" in done.stderr
    assert b"Traceback" not in done.stderr


@pytest.mark.parametrize(
    "text", [b"", b"\xff\xfe", b"\0\0", b"#" * 10_000_000, bytes(range(256)) * 16]
)
def test_no_session_text(text: bytes) -> None:
    done = winze("levels", "-", text=text)
    assert done.returncode == 2
    assert b"standard input" in done.stderr
    assert b"Traceback" not in done.stderr


def test_refusals_from_standard_input_have_their_line() -> None:
    done = winze("levels", "-", text=demo_text().replace('"GaAs"', '"GaXs"', 1))
    assert done.returncode == 2
    assert b"standard input, line 15: left material" in done.stderr


def test_what_is_not_proved_is_said() -> None:
    done = winze("levels", "-", "--json", "--to", "0.1", text=UNPROVED)
    result = json.loads(done.stdout)
    assert done.returncode == 3
    assert result["complete"] is False
    assert result["counted"] == len(result["levels"])
    assert result["levels"]
    assert "proof" in [note["topic"] for note in result["advice"]]
    narrow = winze("levels", "-", "--max-width", "0.001", text=UNPROVED)
    assert narrow.returncode == 0


def test_a_reader_that_leaves() -> None:
    command = f"{' '.join(WINZE)} spectrum - --points 200000 | head -1"
    done = subprocess.run(
        ["bash", "-c", command],
        input=demo_text().encode(),
        capture_output=True,
        check=False,
        cwd=TOP,
        timeout=60,
    )
    assert done.stdout.startswith(b"energy_eV")
    assert b"Traceback" not in done.stderr
    assert b"rror" not in done.stderr


def test_interrupt() -> None:
    layers = "[[layer]]\nedge_eV=0.3\nmass=0.09\nthickness_nm=2\n" * 4000
    contacts = "[left]\nedge_eV=0\nmass=0.07\n[right]\nedge_eV=0\nmass=0.07\n"
    process = subprocess.Popen(
        [*WINZE, "spectrum", "-", "--points", "3000000"],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        cwd=TOP,
    )
    assert process.stdin is not None
    process.stdin.write(("format = 1\n" + contacts + layers).encode())
    process.stdin.close()
    time.sleep(2.5)
    process.send_signal(signal.SIGINT)
    process.wait(timeout=30)
    assert process.stderr is not None
    said = process.stderr.read()
    assert process.stdout is not None
    assert process.stdout.read() == b""
    process.stdout.close()
    process.stderr.close()
    assert process.returncode == 130
    assert b"interrupted" in said
    assert b"Traceback" not in said


def test_a_locale_that_cannot_say_the_title() -> None:
    text = demo_text().replace("Kestrel Ridge", "Пустельга", 1)
    text = text.replace('title  = "Kestrel Ridge', 'title  = "Пустельга')
    done = winze("report", "-", text=text, PYTHONIOENCODING="ascii", LANG="C")
    assert done.returncode == 0
    assert b"\\u041f" in done.stdout


def test_no_terminal_for_the_workbench() -> None:
    done = winze()
    assert done.returncode == 2
    assert b"needs a terminal; winze report FILE" in done.stderr


def test_dumb_terminal() -> None:
    pid, terminal = pty.fork()
    if pid == 0:
        os.chdir(TOP)
        os.environ["TERM"] = "dumb"
        os.execv(sys.executable, WINZE)  # noqa: S606
    said = b""
    while True:
        try:
            part = os.read(terminal, 4096)
        except OSError:  # the other end is closed
            break
        if not part:
            break
        said += part
    os.close(terminal)
    _, status = os.waitpid(pid, 0)
    assert os.waitstatus_to_exitcode(status) == 2
    assert b"TERM=dumb" in said
    assert b"winze report FILE" in said


def test_help_and_version(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--version"]) == 0
    assert capsys.readouterr().out.startswith("winze ")
    assert main(["--help"]) == 0
    assert "examples:" in capsys.readouterr().out
