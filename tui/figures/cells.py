"""A sheet of character cells, each with a role that says what it shows, not how it looks."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

Role = Literal["", "axis", "edge", "density", "fill", "level", "curve", "line", "pointer"]
Line = list[tuple[str, Role]]
"""One row: runs of text with their roles."""


@dataclass(frozen=True)
class Glyphs:
    """The characters a figure is made of; one set for rich encodings, one for plain ones."""

    marker: str
    """Marker of plotext for lines."""
    marker_rows: int
    """Rows of dots that one cell has with that marker."""
    level: str
    line: str
    pointer: str
    fill: str
    upright: str
    across: str
    corner: str
    tick_left: str
    tick_below: str
    cross_below: str


RICH = Glyphs("braille", 4, "━", "┄", "▶", "·", "│", "─", "└", "┤", "┬", "┴")
PLAIN = Glyphs("#", 1, "=", "-", ">", ".", "|", "-", "+", "+", "+", "+")


@dataclass
class Cells:
    """Rows of cells; outside its bounds nothing is written and nothing fails."""

    width: int
    height: int
    rows: list[list[tuple[str, Role]]] = field(default_factory=list)

    def __post_init__(self) -> None:
        if not self.rows:
            self.rows = [[(" ", "")] * self.width for _ in range(self.height)]

    def put(self, row: int, column: int, text: str, role: Role, *, over: bool = True) -> None:
        """Write a text; without ``over`` only into blank cells."""
        if not 0 <= row < self.height:
            return
        for offset, character in enumerate(text):
            at = column + offset
            if 0 <= at < self.width and (over or self.is_blank(row, at)):
                self.rows[row][at] = (character, role)

    def is_blank(self, row: int, column: int) -> bool:
        """Whether a cell is empty."""
        return self.rows[row][column][0] == " "

    def paste(self, other: Cells, row: int, column: int) -> None:
        """Lay another sheet on this one, inside its bounds; its blank cells let through."""
        for below, line in zip(self.rows[row:], other.rows, strict=False):
            for at, cell in enumerate(line[: self.width - column], start=column):
                if cell[0] != " ":
                    below[at] = cell

    def copy(self) -> Cells:
        """Give an independent copy."""
        return Cells(self.width, self.height, [row[:] for row in self.rows])

    def lines(self) -> list[Line]:
        """Gather equal roles into runs."""
        return [_runs(row) for row in self.rows]

    def text(self) -> str:
        """Give the characters alone, blanks at the ends of rows taken off."""
        return "\n".join("".join(c for c, _ in row).rstrip() for row in self.rows)


def _runs(row: list[tuple[str, Role]]) -> Line:
    runs: Line = []
    for character, role in row:
        if runs and runs[-1][1] == role:
            runs[-1] = (runs[-1][0] + character, role)
        else:
            runs.append((character, role))
    return runs
