"""Numbers with units, and tables in columns."""

from __future__ import annotations

import math

import pytest

from tui.report import quantities
from tui.report.text import columns


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
    ],
)
def test_energy(value: float, text: str) -> None:
    assert quantities.energy(value) == text


def test_width() -> None:
    assert quantities.width(0.0, -math.inf) == "none"
    assert quantities.width(0.0, -400.25) == "1e-400.2 eV"
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


def test_columns() -> None:
    text = columns(("n", "name", "x"), [["1", "ab", "1.5"], ["10", "c", "22.5"]], (1,))
    assert text == " n  name     x\n 1  ab     1.5\n10  c     22.5\n"
