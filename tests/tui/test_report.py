"""Numbers with units, tables in columns, and the report that is made of them."""

from __future__ import annotations

import math
from dataclasses import replace
from functools import lru_cache

import pytest

from tui.report import quantities
from tui.report.layout import columns
from tui.report.text import report_text
from tui.session.demo import demo_text
from tui.session.read import read_session
from tui.study import Request, Study, solve

RICH = """\
format = 1
title = "Salt flat, wafer 3"
notes = "first line\\n  second line"
conditions = { temperature_K = 77, bias_V = 0.05 }
left = { material = "GaAs", donors_cm3 = 1e18 }
right = { edge_eV = 0.02, mass = 0.07, fermi_eV = 0.03 }
[[layer]]
label = "ramp"
material = "GaAs"
to_material = "Al0.3Ga0.7As"
thickness_nm = 5.0
[[layer]]
label = "well"
edge_eV = 0.0
mass = 0.067
thickness_nm = 6.0
donors_cm3 = 2e17
[[layer]]
material = "Al0.3Ga0.7As"
thickness_ml = 10
"""


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (1.5, "1.500 eV"),
        (0.0623, "62.30 meV"),
        (1.12e-3, "1.120 meV"),
        (0.99999999e-3, "1.000 meV"),
        (5.598e-4, "559.8 ueV"),
        (3.2e-9, "3.200 neV"),
        (3.2e-14, "0.032 peV"),
        (5.6e-21, "5.600e-21 eV"),
        (-0.02, "-20.00 meV"),
        (0.0, "0 eV"),
        (0.99996, "1.000 eV"),
        (0.99994, "999.9 meV"),
        (9.99996e-3, "10.00 meV"),
        (99.9996e-3, "100.0 meV"),
        (5e-324, "4.941e-324 eV"),
    ],
)
def test_energy(value: float, text: str) -> None:
    assert quantities.energy(value) == text


def test_width() -> None:
    assert quantities.width(0.0, -math.inf) == "none"
    assert quantities.width(0.0, -400.25) == "5.623e-401 eV"
    assert quantities.width(1e-3, -3.0) == "1.000 meV"


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (5.879e-13, "587.9 fs"),
        (4.2e-12, "4.200 ps"),
        (3.0, "3.000 s"),
        (1.17e5, "1.170e+05 s"),
        (math.inf, "for ever"),
        (math.nan, "-"),
    ],
)
def test_duration(value: float, text: str) -> None:
    assert quantities.duration(value) == text


def test_probability() -> None:
    assert quantities.probability(0.25, math.log10(0.25)) == "0.2500"
    assert quantities.probability(2.5e-7, math.log10(2.5e-7)) == "2.50e-7"
    assert quantities.probability(0.0, -412.3) == "5.01e-413"
    assert quantities.probability(0.0, -math.inf) == "0"
    assert quantities.probability(9.996e-4, math.log10(9.996e-4)) == "1.00e-3"
    assert quantities.probability(0.99999, 0.0) == "1.0000"


def test_columns() -> None:
    text = columns(("n", "name", "x"), [["1", "ab", "1.5"], ["10", "c", "22.5"]], (1,))
    assert text == " n  name     x\n 1  ab     1.5\n10  c     22.5\n"


def test_columns_of_wide_and_accented_signs() -> None:
    """A terminal gives two cells to a wide sign and none to an accent that stands alone."""
    accent = "e\u0301"
    text = columns(("n", "name", "x"), [["1", "\u969c\u58c1", "1"], ["2", accent, "2"]], (1,))
    assert text == f"n  name  x\n1  \u969c\u58c1  1\n2  {accent}     2\n"


@lru_cache(maxsize=1)
def rich() -> Study:
    return solve(Request(read_session(RICH, "rich")))


def part(text: str, head: str) -> list[str]:
    """Lines of one part of a report, below its head."""
    return text[text.index(head) :].split("\n\n", maxsplit=1)[0].splitlines()[1:]


def test_the_report_says_what_was_asked() -> None:
    text = report_text(rich(), "rich.toml")
    lines = text.split("\n")
    assert lines[:4] == ["Salt flat, wafer 3", "from rich.toml", "  first line", "    second line"]
    assert lines[4].startswith("77 K, bias 0.05 V, uniform field; built-in ")
    assert lines[4].endswith(f"3 layers, {rich().scene.structure.thickness_nm:.4f} nm")


def test_the_report_shows_every_layer() -> None:
    rows = part(report_text(rich(), "x"), "Stack")
    assert [row.split()[0] for row in rows[1:]] == ["L", "1", "2", "3", "R"]
    ramp = rich().scene.structure.layers[0]
    assert f"0.0000 to {ramp.to_edge_eV:.4f}" in rows[2]
    assert {"ramp", "GaAs", "5.0000"} <= set(rows[2].split())
    assert {"well", "6.0000", "2e+17"} <= set(rows[3].split())
    assert {"Al0.3Ga0.7As", "10.00"} <= set(rows[4].split())
    assert "Fermi +30.00 meV" in rows[5]
    edge = rich().profile.contact_edge_eV[1]
    assert rows[5].split()[-1] == f"{edge:.4f}"


def test_the_report_shows_every_level_and_the_proof() -> None:
    study = rich()
    rows = part(report_text(study, "x"), "Levels from")
    assert len(study.levels.levels) > 0
    for row, (number, level) in zip(
        rows[1:], enumerate(study.levels.levels, start=1), strict=False
    ):
        assert row.split()[:2] == [str(number), f"{1e3 * level.energy_eV:.5f}"]
    count = len(study.levels.levels)
    assert rows[-1] == f"{count} found, {count} counted: complete"


def test_the_report_shows_transmission_and_notes() -> None:
    study = rich()
    text = report_text(study, "x")
    energies = [float(row.split()[0]) for row in part(text, "Transmission")[1:]]
    assert energies == sorted(energies)
    assert energies[0] == pytest.approx(study.scene.from_eV, abs=1e-5)
    assert energies[-1] == pytest.approx(study.scene.to_eV, abs=1e-5)
    for note in study.advice:
        assert f"- {note.topic}: {note.text}" in text


def test_the_report_is_ascii_but_for_what_the_user_typed() -> None:
    assert report_text(rich(), "x").isascii()
    typed = demo_text().replace("first barrier", "\u0431\u0430\u0440\u044c\u0435\u0440")
    text = report_text(solve(Request(read_session(typed, "x"))), "x")
    assert "\u0431\u0430\u0440\u044c\u0435\u0440" in text


def test_the_report_of_an_unproved_or_empty_window() -> None:
    study = rich()
    unproved = replace(study, levels=replace(study.levels, complete=False))
    assert "the count could not be proved, some may be missing" in report_text(unproved, "x")
    empty = replace(study, levels=replace(study.levels, levels=(), counted=0), advice=())
    text = report_text(empty, "x")
    assert "none\n0 found, 0 counted: complete" in text
    assert text.endswith("Notes\nnone\n")
