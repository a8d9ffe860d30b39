"""The figure of a current: J, or the decades of its size, over bias.

Peaks and valleys are marked with a number, curves at other temperatures have a marker of their own
and their name at the right. Below the curve each level has a row that shows its share of the
current, under its number; where there is no room, one row says which level carries most.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from physics.curve import Curve as CurrentCurve
from tui.amounts import prefix_of
from tui.branches import Branch, branches_of
from tui.figures.axes import lower_axis
from tui.figures.cells import Cells, Glyphs, Role
from tui.figures.curves import Curve, FloatArray, Limits, column_of, draw, row_of
from tui.figures.ticks import round_ticks, tick_text
from tui.overlay import Overlay
from tui.sweep import Sweep

LABEL_WIDTH = 8
AXIS_ROWS = 2
NAME_WIDTH = 8
"""Room at the right for the names of curves, where there are several."""
MIN_WIDTH, MIN_HEIGHT = 44, 7
PAD_ABOVE, PAD_BELOW = 0.14, 0.05
NEXT_TO_ZERO = 0.01
"""Share of the range of bias about zero that the decades' lower end takes no notice of."""
MOST_DECADES = 12.0
"""Currents smaller than the largest by more run along the lower edge."""
ROWS_A_SHARE = 5
"""Rows of the figure for one row of a level's share, at least."""
SHOWN_FROM = 0.02
"""Largest share from which a level has its row."""
CARRIES = 0.5
"""Share from which a level is said to carry the current."""
OVERLAYS: tuple[Role, ...] = ("overlay 1", "overlay 2", "overlay 3", "overlay 4")


@dataclass(frozen=True, eq=False)
class Scene:
    """What is drawn."""

    sweep: Sweep
    overlays: tuple[Overlay, ...] = ()
    is_log: bool = False


@dataclass(frozen=True)
class Feature:
    """A peak or a valley under its short name."""

    name: str
    bias_V: float
    current_density_A_per_cm2: float

    @property
    def said(self) -> str:
        """What it is, in words."""
        return f"{'peak' if self.name[0] == 'P' else 'valley'} {self.name}"


@dataclass(frozen=True, eq=False)
class CurrentBase:
    """What stays while the bias in hand moves."""

    scene: Scene
    cells: Cells
    glyphs: Glyphs
    limits: Limits
    """Bias across; upwards the current in the axis' unit, or its decades."""
    scale: float
    """A/cm2 in the axis' unit; 1 for decades."""
    rows: int
    width: int
    branches: tuple[Branch, ...]
    """Levels that carry current."""

    def column_of(self, bias_V: float) -> int:
        """Column of a bias."""
        return LABEL_WIDTH + 1 + column_of(bias_V, self.limits, self.width)

    def row_of(self, current_A_per_cm2: float) -> int:
        """Row of a current."""
        height = float(self.heights(np.array([current_A_per_cm2]))[0])
        height = min(max(height, self.limits.bottom), self.limits.top)
        return row_of(height, self.limits, self.rows, self.glyphs)

    def heights(self, current_A_per_cm2: FloatArray) -> FloatArray:
        """Say currents as the axis does; none at all lies at the lower edge of the decades."""
        return _heights(current_A_per_cm2, self.scale, self.limits, is_log=self.scene.is_log)

    def bias_step_V(self) -> float:
        """Bias that one column stands for."""
        return (self.limits.right - self.limits.left) / (self.width - 1)


def features_of(sweep: Sweep) -> tuple[Feature, ...]:
    """Name peaks and valleys, outward from zero bias: P1, V1, P2 ..."""
    found = []
    for number, region in enumerate(sweep.regions, start=1):
        for letter, point in (("P", region.peak), ("V", region.valley)):
            if point is not None:
                at = point.bias_V, point.current_density_A_per_cm2
                found.append(Feature(f"{letter}{number}", *at))
    return tuple(found)


def current_base(scene: Scene, width: int, height: int, glyphs: Glyphs) -> CurrentBase:
    """Draw what stays; ``width`` and ``height`` are in cells, at least the minima above."""
    width, height = max(width, MIN_WIDTH), max(height, MIN_HEIGHT)
    branches = tuple(
        branch
        for branch in branches_of(scene.sweep.curve)
        if np.abs(branch.share).max() >= SHOWN_FROM
    )
    shares = _share_rows(len(branches), height)
    rows = height - AXIS_ROWS - shares
    right = NAME_WIDTH if scene.overlays else 1
    limits, scale = _limits(scene)
    cells = Cells(width, height)
    room = width - LABEL_WIDTH - 1 - right
    base = CurrentBase(scene, cells, glyphs, limits, scale, rows, room, branches)
    curves = [
        _line(base, item.curve, role) for item, role in zip(scene.overlays, OVERLAYS, strict=False)
    ]
    curves.append(_line(base, scene.sweep.curve, "curve"))
    cells.paste(draw(curves, limits, room, rows, glyphs), 0, LABEL_WIDTH + 1)
    _axes(base)
    _features(base)
    _shares(base, shares)
    if scene.overlays:
        _names(base)
    return base


def current_figure(
    base: CurrentBase, bias_V: float | None, current_A_per_cm2: float | None
) -> Cells:
    """Lay the bias in hand on what stays; None, or out of sight, lays nothing."""
    cells = base.cells.copy()
    if bias_V is None or not base.limits.left <= bias_V <= base.limits.right:
        return cells
    column, foot = base.column_of(bias_V), cells.height - AXIS_ROWS
    for row in range(base.rows):
        cells.put(row, column, base.glyphs.upright_line, "line", over=False)
    if current_A_per_cm2 is not None:
        cells.put(base.row_of(current_A_per_cm2), column, base.glyphs.here, "pointer")
    cells.put(foot, column, base.glyphs.upward, "pointer")
    text = f" {bias_V:.4f} "
    start = min(max(column - len(text) // 2, LABEL_WIDTH + 1), cells.width - len(text))
    cells.put(foot + 1, start, text, "pointer")
    return cells


def _share_rows(levels: int, height: int) -> int:
    """Rows that the levels' shares take: one each, or one for all of them."""
    return min(levels, max(1, height // ROWS_A_SHARE - 1)) if levels else 0


def _limits(scene: Scene) -> tuple[Limits, float]:
    sweep = scene.sweep
    curves = [sweep.curve, *(item.curve for item in scene.overlays)]
    every = np.concatenate([curve.current_density_A_per_cm2 for curve in curves])
    size = np.abs(every)
    most = float(size.max())
    if scene.is_log:
        # Next to zero bias the current has no end of decades: the first column need not show them.
        bias = np.concatenate([curve.bias_V for curve in curves])
        seen = (size > 0.0) & (np.abs(bias) >= NEXT_TO_ZERO * (sweep.to_V - sweep.from_V))
        least = float(size[seen].min(initial=most))
        top = math.log10(most) if most > 0.0 else 0.0
        bottom = max(math.log10(least) if least > 0.0 else -1.0, top - MOST_DECADES)
        scale = 1.0
    else:
        scale = prefix_of(most)[0]
        top, bottom = (max(float(every.max()), 0.0)), min(float(every.min()), 0.0)
        top, bottom = top / scale, bottom / scale
    span = top - bottom or 1.0
    below = PAD_BELOW
    if not scene.is_log:
        below = PAD_ABOVE if bottom < 0.0 else 0.0
    limits = Limits(sweep.from_V, sweep.to_V, bottom - below * span, top + PAD_ABOVE * span)
    return limits, scale


def _heights(
    current_A_per_cm2: FloatArray, scale: float, limits: Limits, *, is_log: bool
) -> FloatArray:
    if not is_log:
        return current_A_per_cm2 / scale
    size = np.abs(current_A_per_cm2)
    bottom = np.full(size.shape, limits.bottom)
    decades = np.log10(size, out=bottom.copy(), where=size > 0.0)
    heights: FloatArray = np.maximum(decades, bottom)
    return heights


def _line(base: CurrentBase, curve: CurrentCurve, role: Role) -> Curve:
    return Curve(curve.bias_V, base.heights(curve.current_density_A_per_cm2), role)


def _axes(base: CurrentBase) -> None:
    cells, glyphs, limits = base.cells, base.glyphs, base.limits
    for row in range(cells.height - AXIS_ROWS):
        cells.put(row, LABEL_WIDTH, glyphs.upright, "axis")
    ticks = round_ticks(limits.bottom, limits.top, max(2, base.rows // 3))
    for tick in ticks:
        row = row_of(tick, limits, base.rows, glyphs)
        if row > 0:
            text = f"1e{tick:g}" if base.scene.is_log else tick_text(tick, ticks)
            cells.put(row, 0, text.rjust(LABEL_WIDTH - 1)[: LABEL_WIDTH - 1], "axis")
            cells.put(row, LABEL_WIDTH, glyphs.tick_left, "axis")
        if tick == 0.0 and not base.scene.is_log and row < base.rows - 1:
            for column in range(LABEL_WIDTH + 1, LABEL_WIDTH + 1 + base.width):
                cells.put(row, column, glyphs.across, "axis", over=False)
    unit = "A/cm2" if base.scene.is_log else f"{prefix_of(base.scale)[1]}A/cm2"
    cells.put(0, 0, unit.rjust(LABEL_WIDTH - 1), "axis")
    foot = cells.height - AXIS_ROWS
    cells.put(foot, LABEL_WIDTH, glyphs.corner, "axis")
    cells.paste(lower_axis(base.width, limits, "bias V", glyphs), foot, LABEL_WIDTH + 1)


def _features(base: CurrentBase) -> None:
    """Mark peaks and valleys, each with its name above, below or beside it."""
    for feature in features_of(base.scene.sweep):
        column = base.column_of(feature.bias_V)
        row = base.row_of(feature.current_density_A_per_cm2)
        outward = (feature.name[0] == "P") == (feature.current_density_A_per_cm2 >= 0.0)
        first = -1 if outward or (base.scene.is_log and feature.name[0] == "P") else 1
        left, wide = column - len(feature.name) // 2, len(feature.name)
        places = [(row + first, left), (row, column + 2), (row, column - 1 - wide)]
        places += [(row - first, left), (row + 2 * first, left)]
        free = [place for place in places if _is_free(base, *place, wide)]
        at_row, at_column = free[0] if free else places[0]
        base.cells.put(at_row, at_column, feature.name, "feature")
        base.cells.put(row, column, base.glyphs.feature, "feature")


def _is_free(base: CurrentBase, row: int, column: int, wide: int) -> bool:
    if not 0 <= row < base.rows or not LABEL_WIDTH < column <= LABEL_WIDTH + base.width - wide:
        return False
    return all(base.cells.is_blank(row, at) for at in range(column, column + wide))


def _shares(base: CurrentBase, count: int) -> None:
    """Show each level's share of the current over bias; or in one row who carries most of it."""
    curve = base.scene.sweep.curve
    bias = np.linspace(base.limits.left, base.limits.right, base.width)
    at = [np.interp(bias, curve.bias_V, branch.share) for branch in base.branches]
    if count < len(base.branches):
        best = np.argmax(at, axis=0)
        carried = np.max(at, axis=0) >= CARRIES
        letters = [
            base.branches[n].sign if is_carried else " "
            for n, is_carried in zip(best, carried, strict=True)
        ]
        _share_row(base, 0, "level", "".join(letters))
        return
    ramp = base.glyphs.shares
    for n, (branch, share) in enumerate(zip(base.branches, at, strict=True)):
        steps = np.clip(share * (len(ramp) - 1) + 0.5, 0, len(ramp) - 1).astype(np.int64)
        _share_row(base, n, f"share {branch.sign}", "".join(ramp[step] for step in steps))


def _share_row(base: CurrentBase, n: int, name: str, text: str) -> None:
    row = base.rows + n
    base.cells.put(row, 0, name.rjust(LABEL_WIDTH - 1)[: LABEL_WIDTH - 1], "share")
    base.cells.put(row, LABEL_WIDTH + 1, text, "share")


def _names(base: CurrentBase) -> None:
    """Name each curve at its right end, one below the other where they end together."""
    scene, start = base.scene, base.cells.width - NAME_WIDTH + 1
    own = scene.sweep.request.session.conditions.temperature_K
    named: list[tuple[float, Role, CurrentCurve]] = [(own, "curve", scene.sweep.curve)]
    for item, role in zip(scene.overlays, OVERLAYS, strict=False):
        named.append((item.temperature_K, role, item.curve))
    wanted = [
        (base.row_of(float(curve.current_density_A_per_cm2[-1])), temperature, role)
        for temperature, role, curve in named
    ]
    taken = 0
    for n, (row, temperature, role) in enumerate(sorted(wanted)):
        latest = base.rows - (len(wanted) - n)
        taken = min(max(row, taken), latest)
        marker = base.glyphs.markers[role]
        sign = marker if len(marker) == 1 else " "
        base.cells.put(taken, start, f"{sign}{temperature:g} K", role)
        taken += 1
