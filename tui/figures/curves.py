"""Curves into cells, by plotext; and the one map from values to rows and columns.

Each drawing has a plotext figure of its own: the global one is shared by all threads. Sizes
and limits are explicit, axes and frame are off (they are drawn beside, so that two panels can share
one), and the scale is always linear: a logarithm is taken before.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tui.figures.cells import Cells, Glyphs, Role

FloatArray = NDArray[np.float64]
IndexArray = NDArray[np.int64]
_COLOUR = re.compile(r"\x1b\[([0-9;]*)m")
POINTS_A_COLUMN = 4


@dataclass(frozen=True, eq=False)
class Curve:
    """A line through points; nan breaks it."""

    x: FloatArray
    y: FloatArray
    role: Role


@dataclass(frozen=True)
class Limits:
    """What the first and the last column and row show."""

    left: float
    right: float
    bottom: float
    top: float


def draw(curves: list[Curve], limits: Limits, width: int, height: int, glyphs: Glyphs) -> Cells:
    """Draw curves, clipped to the limits, into cells of their roles.

    Parameters
    ----------
    curves : list of Curve
        Points in the units of the limits; infinite values have to be clipped before.
    width, height : int
        Size of the result.
    """
    from plotext._figure import _figure_class  # the only way to a figure of one's own

    figure = _figure_class()
    figure._limit_size(False, False)
    figure.plot_size(width, height)
    figure.frame(False)
    figure.xaxes(False, False)
    figure.yaxes(False, False)
    figure.xticks([])
    figure.yticks([])
    for name in ("canvas_color", "axes_color", "ticks_color"):
        getattr(figure, name)("default")
    figure.xlim(limits.left, limits.right)
    figure.ylim(limits.bottom, limits.top)
    for number, curve in enumerate(curves, start=1):
        for x, y in _pieces(curve, limits):
            figure.plot(x, y, color=number, marker=glyphs.markers[curve.role])
    return _cells(figure.build(), width, height, [curve.role for curve in curves])


def row_of(value: float, limits: Limits, height: int, glyphs: Glyphs) -> int:
    """Row, from the top, in which a curve at this height is drawn."""
    share = (value - limits.bottom) / (limits.top - limits.bottom)
    dots = glyphs.marker_rows
    return height - 1 - int(share * (dots * height - 1) + 0.5) // dots


def band_of(limits: Limits, height: int, glyphs: Glyphs, first: int, last: int) -> Limits:
    """Limits that draw rows ``first`` to ``last`` alone just as the whole drawing has them."""
    dots = glyphs.marker_rows
    scale = (limits.top - limits.bottom) / (dots * height - 1)
    bottom = limits.bottom + scale * dots * (height - 1 - last)
    top = limits.bottom + scale * (dots * (height - first) - 1)
    return Limits(limits.left, limits.right, bottom, top)


def column_of(value: float, limits: Limits, width: int) -> int:
    """Column in which a value is drawn."""
    share = (value - limits.left) / (limits.right - limits.left)
    return int(share * (width - 1) + 0.5)


def thinned(x: FloatArray, y: FloatArray, columns: int) -> tuple[FloatArray, FloatArray]:
    """Keep the first, lowest, highest and last point of each column's worth of y over x.

    Many thousand points become a few hundred, and look the same.
    """
    if x.size <= POINTS_A_COLUMN * columns or not x[-1] > x[0]:
        return x, y
    starts, ends, order = _by_column(x, y, columns)
    keep = np.unique(np.concatenate([starts, ends, order[starts], order[ends]]))
    return x[keep], y[keep]


def outline(x: FloatArray, y: FloatArray, columns: int) -> tuple[IndexArray, IndexArray]:
    """Give the indices of the lowest and of the highest point of each column's worth of y over x.

    Parameters
    ----------
    x, y : array, shape (N,)
        Points, x not falling and not all the same.
    """
    starts, ends, order = _by_column(x, y, columns)
    return order[starts], order[ends]


def _by_column(
    x: FloatArray, y: FloatArray, columns: int
) -> tuple[IndexArray, IndexArray, IndexArray]:
    """First and last index of each column's points, and the order by height within columns."""
    column = np.minimum((x - x[0]) / (x[-1] - x[0]) * columns, columns - 1).astype(np.int64)
    starts = np.flatnonzero(np.diff(column, prepend=-1))
    ends = np.append(starts[1:], x.size) - 1
    return starts, ends, np.lexsort((y, column))


def _pieces(curve: Curve, limits: Limits) -> list[tuple[list[float], list[float]]]:
    """Cut a curve at its nans and keep it inside the limits."""
    shown = np.isfinite(curve.x) & np.isfinite(curve.y)
    x = np.clip(curve.x, min(limits.left, limits.right), max(limits.left, limits.right))
    y = np.clip(curve.y, limits.bottom, limits.top)
    breaks = np.flatnonzero(~shown)
    parts = zip(np.split(x, breaks), np.split(y, breaks), np.split(shown, breaks), strict=True)
    return [(px[ok].tolist(), py[ok].tolist()) for px, py, ok in parts if ok.any()]


def _cells(built: str, width: int, height: int, roles: list[Role]) -> Cells:
    """Read plotext's coloured text: its colour numbers are our curves."""
    cells = Cells(width, height)
    for row, line in enumerate(built.split("\n")[:height]):
        column, role = 0, roles[0] if roles else ""
        for n, part in enumerate(_COLOUR.split(line)):
            if n % 2:
                codes = part.split(";")
                known = codes[0] == "38" and 1 <= int(codes[-1]) <= len(roles)
                role = roles[int(codes[-1]) - 1] if known else ""
            elif part:
                cells.put(row, column, part, role)
                column += len(part)
    return cells
