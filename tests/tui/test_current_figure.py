"""The figure of a current: rows and columns line up with what they show."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tui.amounts import amount
from tui.bias_point import point_at, point_between
from tui.branches import branches_of, sign_of
from tui.figures.cells import PLAIN, RICH, Cells, Glyphs
from tui.figures.current_figure import (
    LABEL_WIDTH,
    Scene,
    current_base,
    current_figure,
    features_of,
)
from tui.overlay import overlay
from tui.session.demo import demo_text
from tui.session.read import read_session
from tui.session.resolve import resolve
from tui.sweep import Sweep, SweepRequest, drive_of, sweep
from tui.workbench.current_readout import current_lines, report

DEMO = read_session(demo_text(), "demo")


@pytest.fixture(scope="module")
def found() -> Sweep:
    return sweep(SweepRequest(DEMO, 0.0, 0.2))


@pytest.fixture(scope="module")
def both() -> Sweep:
    return sweep(SweepRequest(DEMO, -0.2, 0.2))


def roles(cells: Cells, row: int) -> set[str]:
    return {role for _, role in cells.rows[row]}


@pytest.mark.parametrize("glyphs", [RICH, PLAIN])
@pytest.mark.parametrize("is_log", [False, True])
def test_the_curve_runs_through_the_cells_that_are_promised(
    found: Sweep, glyphs: Glyphs, is_log: bool
) -> None:
    base = current_base(Scene(found, is_log=is_log), 100, 24, glyphs)
    curve = found.curve
    for bias, current in zip(curve.bias_V, curve.current_density_A_per_cm2, strict=True):
        row, column = base.row_of(float(current)), base.column_of(float(bias))
        # A dot may fall into the cell beside it; marks and names of features may cover it.
        near = {base.cells.rows[row][column + n][1] for n in (-1, 0, 1)}
        assert near & {"curve", "feature"}, (bias, current)


def test_peaks_and_valleys_are_marked_and_named(both: Sweep) -> None:
    base = current_base(Scene(both), 110, 24, PLAIN)
    features = features_of(both)
    assert {feature.name for feature in features} == {"P1", "V1", "P2", "V2"}
    text = base.cells.text()
    for feature in features:
        assert text.count(feature.name) == 1
        row = base.row_of(feature.current_density_A_per_cm2)
        assert base.cells.rows[row][base.column_of(feature.bias_V)] == ("O", "feature")


def test_both_signs_have_a_line_at_zero(both: Sweep) -> None:
    base = current_base(Scene(both), 90, 24, PLAIN)
    zero = "".join(c for c, _ in base.cells.rows[base.row_of(0.0)])
    assert zero.split()[0] == "0"
    assert zero.count("-") > 40
    assert base.row_of(1e4) < base.row_of(0.0) < base.row_of(-1e4)


def test_no_current_at_all_is_at_the_foot_of_the_decades(both: Sweep) -> None:
    curve = both.curve
    assert 0.0 in curve.current_density_A_per_cm2
    base = current_base(Scene(both, is_log=True), 90, 24, PLAIN)
    assert base.row_of(0.0) == base.rows - 1
    assert base.row_of(-5e3) == base.row_of(5e3) < base.rows - 1
    none = replace(curve, current_density_A_per_cm2=np.zeros(curve.bias_V.size))
    for is_log in (False, True):
        empty = replace(both, curve=none, regions=(), main=None, figures=None)
        cells = current_figure(current_base(Scene(empty, (), is_log), 90, 24, PLAIN), 0.1, 0.0)
        assert "curve" in {role for row in range(24) for role in roles(cells, row)}


def test_temperatures_have_a_marker_of_their_own_and_a_name(found: Sweep) -> None:
    over = tuple(overlay(DEMO, T, (0.0, 0.2)) for T in (77.0, 4.2))
    base = current_base(Scene(found, over, is_log=True), 100, 24, PLAIN)
    signs = {
        role: {c for row in base.cells.rows for c, r in row[:-8] if r == role}
        for role in ("curve", "overlay 1", "overlay 2")
    }
    assert signs == {"curve": {"*"}, "overlay 1": {"+"}, "overlay 2": {"x"}}
    text = base.cells.text()
    assert "*300 K" in text
    assert "+77 K" in text
    assert "x4.2 K" in text
    rich = current_base(Scene(found, over, is_log=True), 60, 10, RICH).cells.text()
    assert "300 K" in rich
    assert "x4.2 K" in rich


def test_shares_stand_under_their_number(found: Sweep) -> None:
    base = current_base(Scene(found), 110, 24, PLAIN)
    lines = base.cells.text().split("\n")
    first = next(line for line in lines if line.startswith("share 1"))
    assert "@" in first
    one, two = branches_of(found.curve)[:2]
    peak = found.regions[0].peak
    n = int(np.argmin(np.abs(found.curve.bias_V - peak.bias_V)))
    assert one.share[n] > 0.9 > two.share[n]
    assert first[base.column_of(peak.bias_V)] == "@"
    small = current_base(Scene(found), 60, 10, PLAIN).cells.text().split("\n")
    carried = next(line for line in small if line.startswith("  level"))
    assert carried[LABEL_WIDTH + 1 :].strip().startswith("1")


def test_the_bias_in_hand_is_marked(found: Sweep) -> None:
    base = current_base(Scene(found), 90, 24, PLAIN)
    before = base.cells.text()
    cells = current_figure(base, 0.05, 4e3)
    column = base.column_of(0.05)
    assert {cells.rows[row][column][1] for row in range(base.rows)} >= {"line", "pointer"}
    assert cells.rows[base.row_of(4e3)][column] == ("@", "pointer")
    assert " 0.0500 " in cells.text()
    assert base.cells.text() == before
    for outside in (-0.1, 0.3, None):
        assert current_figure(base, outside, None).text() == before


@pytest.mark.parametrize("glyphs", [RICH, PLAIN])
@pytest.mark.parametrize(("width", "height"), [(44, 7), (80, 12), (110, 20), (300, 90)])
def test_every_size(both: Sweep, glyphs: Glyphs, width: int, height: int) -> None:
    for is_log in (False, True):
        base = current_base(Scene(both, is_log=is_log), width, height, glyphs)
        for bias in (-0.2, 0.0, 0.2):
            cells = current_figure(base, bias, 1e9)
            assert len(cells.rows) == height
            assert all(len(row) == width for row in cells.rows)
            assert glyphs is RICH or cells.text().isascii()


def test_a_point_is_computed_there_and_agrees_with_the_curve(found: Sweep) -> None:
    drive, _ = drive_of(DEMO, resolve(DEMO), (0.0, 0.2))
    exact, near = point_at(drive, 0.1), point_between(found.curve, 0.1)
    assert exact.is_exact
    assert not near.is_exact
    assert near.current_density_A_per_cm2 == pytest.approx(
        exact.current_density_A_per_cm2, rel=2e-2
    )
    around = [point_at(drive, bias).current_density_A_per_cm2 for bias in (0.0999, 0.1001)]
    slope = (around[1] - around[0]) / 2e-4
    assert exact.conductance_S_per_cm2 == pytest.approx(slope, rel=1e-4)
    assert sum(exact.level_share) == pytest.approx(1.0, abs=0.02)
    signs = [sign_of(branches_of(found.curve), found.curve.bias_V, 0.1, e) for e in exact.level_eV]
    assert signs[:2] == ["1", "2"]
    assert sign_of(branches_of(found.curve), found.curve.bias_V, 0.1, 5.0) == ""


@pytest.mark.parametrize("width", [60, 80, 110, 200])
@pytest.mark.parametrize("height", [3, 6])
def test_the_read_out_fits(found: Sweep, width: int, height: int) -> None:
    point = point_between(found.curve, 0.111)
    lines = current_lines(found, branches_of(found.curve), point, width, height)
    assert len(lines) <= height
    assert all(sum(len(text) for text, _ in line) <= width for line in lines)
    text = "\n".join("".join(text for text, _ in line) for line in lines)
    for said in ("0.1110 V", "J ~", "dJ/dV", "P1", "V1", "98.4 %"):
        assert said in text
    assert ("i: more" in text) == ("transit" not in text)


def test_what_does_not_fit_is_in_the_report(found: Sweep) -> None:
    text = "\n".join(report(found))
    for said in (
        "peak",
        "valley",
        "ratio",
        "onset",
        "swing",
        "power",
        "heat",
        "C quantum",
        "dwell",
        "transit",
        "cut-off",
        "none: state [device]",
        "coherent",
    ):
        assert said in text
    assert text.isascii()


@pytest.mark.parametrize(
    ("value", "said"),
    [
        (13969.9, "13.97 kA/cm2"),
        (0.0, "0 A/cm2"),
        (-2.5e-7, "-250.0 nA/cm2"),
        (999.96, "1.000 kA/cm2"),
        (1e-25, "1.000e-25 A/cm2"),
        (3e20, "3.000e+20 A/cm2"),
        (float("nan"), "nan A/cm2"),
    ],
)
def test_amounts(value: float, said: str) -> None:
    assert amount(value, "A/cm2") == said
