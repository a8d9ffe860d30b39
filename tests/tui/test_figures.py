"""Figures are values in, cells out: rows and columns line up with what they show."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tui.figures.axes import lower_axis
from tui.figures.cells import PLAIN, RICH, Cells, Glyphs
from tui.figures.curves import Curve, Limits, band_of, column_of, draw, row_of, thinned
from tui.figures.energy_figure import LABEL_WIDTH, base_figure, figure
from tui.figures.ticks import round_ticks, tick_text
from tui.reading import read_energy, read_level
from tui.session.demo import demo_text
from tui.session.read import read_session
from tui.study import Request, Study, solve

MARKED = ("edge", "density", "curve")


@pytest.fixture(scope="module")
def study() -> Study:
    return solve(Request(read_session(demo_text(), "demo")))


@pytest.mark.parametrize("glyphs", [RICH, PLAIN])
@pytest.mark.parametrize("height", [5, 12, 31])
def test_a_curve_is_drawn_in_the_row_that_is_promised(glyphs: Glyphs, height: int) -> None:
    limits = Limits(0.0, 1.0, -0.3, 0.7)
    for value in (-0.3, -0.111, 0.0, 0.2499, 0.5, 0.7):
        flat = Curve(np.array([0.0, 1.0]), np.array([value, value]), "edge")
        cells = draw([flat], limits, 20, height, glyphs)
        rows = [n for n in range(height) if not cells.is_blank(n, 10)]
        assert rows == [row_of(value, limits, height, glyphs)]


@pytest.mark.parametrize("glyphs", [RICH, PLAIN])
def test_a_band_of_rows_is_drawn_as_in_the_whole(glyphs: Glyphs) -> None:
    limits = Limits(0.0, 1.0, 0.0, 1.0)
    x = np.linspace(0.0, 1.0, 60)
    curve = Curve(x, 0.35 + 0.2 * np.sin(9.0 * x), "density")
    whole = draw([curve], limits, 40, 20, glyphs)
    band = draw([curve], band_of(limits, 20, glyphs, 8, 17), 40, 10, glyphs)
    assert whole.text().split("\n")[8:18] == band.text().split("\n")


def test_columns() -> None:
    limits = Limits(-1.0, 3.0, 0.0, 1.0)
    assert (column_of(-1.0, limits, 41), column_of(3.0, limits, 41)) == (0, 40)
    assert column_of(1.0, limits, 41) == 20


def test_roles_survive_plotext() -> None:
    a = Curve(np.array([0.0, 1.0]), np.array([0.1, 0.1]), "edge")
    b = Curve(np.array([0.0, 1.0]), np.array([0.9, 0.9]), "curve")
    cells = draw([a, b], Limits(0.0, 1.0, 0.0, 1.0), 12, 8, PLAIN)
    assert {role for c, role in cells.rows[0] + cells.rows[7] if c != " "} <= {"edge", "curve"}
    rows = {role: n for n, row in enumerate(cells.rows) for c, role in row if c != " "}
    assert rows["edge"] > rows["curve"]


def test_nan_breaks_a_curve_and_infinity_is_left_out() -> None:
    x = np.linspace(0.0, 1.0, 11)
    y = np.array([0.5] * 4 + [np.nan, np.inf, -np.inf] + [0.5] * 4)
    cells = draw([Curve(x, y, "curve")], Limits(0.0, 1.0, 0.0, 1.0), 41, 5, PLAIN)
    line = cells.text().split("\n")[2]
    assert "*" in line
    assert line[18:22].strip() == ""


def test_thinning_keeps_the_extremes() -> None:
    x = np.linspace(0.0, 1.0, 20_001)
    y = np.exp(-(((x - 0.5) / 1e-4) ** 2))
    tx, ty = thinned(x, y, 80)
    assert tx.size <= 4 * 80
    assert ty.max() == y.max()
    assert ty.min() == y.min()
    assert np.all(np.diff(tx) > 0.0)


@pytest.mark.parametrize(
    ("low", "high", "most", "ticks"),
    [
        (0.0, 1.0, 5, [0.0, 0.2, 0.4, 0.6, 0.8, 1.0]),
        (-0.013, 0.37, 4, [0.0, 0.1, 0.2, 0.3]),
        (0.0, 23.0, 3, [0.0, 10.0, 20.0]),
        (1.0, 1.0, 3, []),
    ],
)
def test_ticks(low: float, high: float, most: int, ticks: list[float]) -> None:
    assert round_ticks(low, high, most) == pytest.approx(ticks)


def test_tick_texts() -> None:
    assert [tick_text(t, [0.0, 0.05]) for t in (0.0, 0.05, -0.1)] == ["0.00", "0.05", "-0.10"]
    assert tick_text(-6.0, [-6.0, -4.0]) == "-6"


def test_levels_and_their_peaks_share_a_row(study: Study) -> None:
    base = base_figure(study, 100, 30, PLAIN)
    for number, level in enumerate(study.levels.levels, start=1):
        row = base.cells.rows[base.row_of(level.energy_eV)]
        left = [role for _, role in row[base.position_column : base.log10_t_column]]
        assert "level" in left
        assert "".join(c for c, _ in row[-3:]).strip() == str(number)
        # The peak reaches T = 1, the right edge of its panel, in this row or beside it.
        reach = max(
            column
            for n in (-1, 0, 1)
            for column in range(base.log10_t_width)
            if base.cells.rows[base.row_of(level.energy_eV) + n][base.log10_t_column + column][1]
            == "curve"
        )
        assert reach >= base.log10_t_width - 2


@pytest.mark.parametrize("glyphs", [RICH, PLAIN])
@pytest.mark.parametrize(("width", "height"), [(44, 7), (80, 12), (110, 20), (300, 90)])
def test_every_size(study: Study, glyphs: Glyphs, width: int, height: int) -> None:
    base = base_figure(study, width, height, glyphs)
    for reading in (read_level(study, 1), read_energy(study, 0.2), read_energy(study, 5.0), None):
        cells = figure(base, reading)
        assert len(cells.rows) == height
        assert all(len(row) == width for row in cells.rows)
        if glyphs is PLAIN:
            assert cells.text().isascii()


def test_the_energy_in_hand_is_marked(study: Study) -> None:
    base = base_figure(study, 90, 24, PLAIN)
    cells = figure(base, read_energy(study, 0.15))
    row = cells.rows[base.row_of(0.15)]
    assert "".join(c for c, _ in row[:LABEL_WIDTH]) == " 0.1500>"
    roles = {role for _, role in row}
    assert {"pointer", "line"} <= roles
    assert "density" in {role for line in cells.rows for _, role in line}
    assert base.cells.text() == base_figure(study, 90, 24, PLAIN).cells.text()


def test_walls_and_levels_stay_in_front_of_the_density(study: Study) -> None:
    for glyphs in (RICH, PLAIN):
        base = base_figure(study, 100, 30, glyphs)
        cells = figure(base, read_level(study, 1))
        joined = 0
        for before, after in zip(base.cells.rows, cells.rows, strict=True):
            for (there, role), (now, its_role) in zip(before, after, strict=True):
                if role in ("edge", "level"):
                    assert its_role == role
                    joined += now != there
                    if glyphs is RICH and role == "edge":
                        assert (ord(there) & ord(now)) == ord(there)  # no dot of the wall is lost
        assert (joined > 0) == (glyphs is RICH)


def test_each_plain_curve_has_a_letter_of_its_own(study: Study) -> None:
    cells = figure(base_figure(study, 100, 30, PLAIN), read_level(study, 1))
    letters = {role: {c for row in cells.rows for c, r in row if r == role} for role in MARKED}
    assert letters == {"edge": {"#"}, "density": {"o"}, "curve": {"*"}}


def test_fermi_energies_are_marked_at_their_contacts() -> None:
    session = read_session(demo_text().replace("2e17", "2e18"), "demo")
    session = replace(session, conditions=replace(session.conditions, bias_V=0.1))
    study = solve(Request(session))
    fermi = study.scene.structure.left.fermi_eV
    assert fermi is not None
    assert fermi > 0.0
    base = base_figure(study, 100, 40, PLAIN)
    marks = [
        (row, column - base.position_column)
        for row, line in enumerate(base.cells.rows)
        for column, (_, role) in enumerate(line)
        if role == "fermi"
    ]
    # A bias of V lowers the right Fermi energy by V, whatever is built in.
    right = (base.row_of(fermi - 0.1), base.position_width - 1)
    assert marks == [(base.row_of(fermi), 0), right]


def test_a_superlattice_is_drawn_by_its_outline() -> None:
    demo = read_session(demo_text(), "demo")
    barrier, well = demo.layers[1], demo.layers[2]
    session = replace(demo, layers=(barrier, well) * 40 + (barrier,))
    base = base_figure(solve(Request(session)), 80, 24, PLAIN)
    top, bottom = base.row_of(0.3249), base.row_of(0.0)
    assert top < bottom - 5
    inside = range(base.position_column + 5, base.log10_t_column - 6)
    for row in range(top + 1, bottom):
        assert "edge" not in {base.cells.rows[row][column][1] for column in inside}
    for row in (top, bottom):
        assert {base.cells.rows[row][column][0] for column in inside} == {"#"}
    strokes = {role for line in base.cells.rows for column in inside for _, role in [line[column]]}
    assert "level" in strokes  # spread over all wells, a level still is seen


@pytest.mark.parametrize("width", [9, 14, 40, 90])
def test_a_lower_axis_keeps_its_title_and_its_numbers(width: int) -> None:
    first, second = (
        lower_axis(width, Limits(-8.0, 0.0, 0.0, 1.0), "log10 T", PLAIN).text().split("\n")
    )
    assert "log10 T" in first
    assert len(first) <= width
    assert second.split()[-1] == "0"


def test_cells_keep_inside_their_bounds() -> None:
    cells = Cells(5, 2)
    cells.put(0, 3, "abc", "edge")
    cells.put(9, 0, "x", "edge")
    cells.put(0, -1, "xy", "axis", over=False)
    assert cells.text() == "y  ab\n"
    assert cells.lines()[1] == [("     ", "")]
