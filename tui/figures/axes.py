"""Axes drawn into cells."""

from __future__ import annotations

import itertools

from tui.figures.cells import Cells, Glyphs
from tui.figures.curves import Limits, column_of
from tui.figures.ticks import round_ticks, tick_text

TICK_COLUMNS = 9
"""A lower axis has at most one tick in so many columns."""


def lower_axis(width: int, limits: Limits, title: str, glyphs: Glyphs) -> Cells:
    """Draw an axis and its numbers, in two rows; the title stands in the axis itself."""
    cells = Cells(width, 2)
    cells.put(0, 0, glyphs.across * width, "axis")
    ticks = round_ticks(limits.left, limits.right, max(2, width // TICK_COLUMNS))
    columns = [column_of(tick, limits, width) for tick in ticks]
    for tick, column in zip(ticks, columns, strict=True):
        text = tick_text(tick, ticks)
        cells.put(0, column, glyphs.tick_below, "axis")
        cells.put(1, min(max(column - len(text) // 2, 0), width - len(text)), text, "axis")
    _put_title(cells, [-1, *columns, width], title)
    return cells


def _put_title(cells: Cells, ends: list[int], title: str) -> None:
    """Write a title into the last gap between ticks that has room for it, or else at the end."""
    gaps = [(a, b) for a, b in itertools.pairwise(ends) if b - a - 1 >= len(title)]
    first, last = gaps[-1] if gaps else (ends[-1] - len(title) - 1, ends[-1])
    room = last - first - 1
    text = f" {title} " if room >= len(title) + 2 else title
    cells.put(0, first + 1 + (room - len(text)) // 2, text, "axis")
