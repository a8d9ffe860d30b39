"""A sheet of character cells, each with a role that says what it shows, not how it looks."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

Role = Literal[
    "",
    "axis",
    "edge",
    "density",
    "fill",
    "level",
    "curve",
    "fermi",
    "line",
    "pointer",
    "feature",
    "share",
    "overlay 1",
    "overlay 2",
    "overlay 3",
    "overlay 4",
]
Line = list[tuple[str, Role]]
"""One row: runs of text with their roles."""


@dataclass(frozen=True)
class Glyphs:
    """The characters a figure is made of; one set for rich encodings, one for plain ones."""

    markers: Mapping[str, str]
    """Marker of plotext for a curve, by its role; with letters, each curve has its own."""
    marker_rows: int
    """Rows of dots that one cell has with these markers."""
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
    upright_line: str
    """The line at the bias in hand, and what points to it from below."""
    upward: str
    feature: str
    """A peak or a valley of a current."""
    here: str
    """The current at the bias in hand."""
    shares: str
    """Shares from none to all, in equal steps."""


_OVERLAYS = {"overlay 1": "+", "overlay 2": "x", "overlay 3": "%", "overlay 4": "&"}
_DOTS = dict.fromkeys(("edge", "density", "curve"), "braille") | _OVERLAYS
_LETTERS = {"edge": "#", "density": "o", "curve": "*"} | _OVERLAYS
RICH = Glyphs(
    *(_DOTS, 4, "━", "┄", "▶", "·", "│", "─", "└", "┤", "┬", "┴"),
    *("┊", "▲", "•", "◆", " ▁▂▃▄▅▆▇█"),
)
PLAIN = Glyphs(
    *(_LETTERS, 1, "=", "-", ">", ".", "|", "-", "+", "+", "+", "+"),
    *(":", "^", "O", "@", " .:-=*%#@"),
)
BRAILLE = 0x2800


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

    def paste_under(self, other: Cells, row: int, column: int, kept: tuple[Role, ...]) -> None:
        """Lay another sheet on this one, but under what has one of the roles ``kept``.

        Where both have dots in a cell, all of them are shown.
        """
        for n, line in enumerate(other.rows[: self.height - row]):
            for m, (character, role) in enumerate(line[: self.width - column]):
                there, its_role = self.rows[row + n][column + m]
                if character != " ":
                    both = its_role in kept
                    cell = (_both(there, character), its_role) if both else (character, role)
                    self.rows[row + n][column + m] = cell

    def copy(self) -> Cells:
        """Give an independent copy."""
        return Cells(self.width, self.height, [row[:] for row in self.rows])

    def lines(self) -> list[Line]:
        """Gather equal roles into runs."""
        return [_runs(row) for row in self.rows]

    def text(self) -> str:
        """Give the characters alone, blanks at the ends of rows taken off."""
        return "\n".join("".join(c for c, _ in row).rstrip() for row in self.rows)


def _both(upper: str, lower: str) -> str:
    """Join the dots of two cells; of other characters the upper one is seen."""
    dots, more = ord(upper) - BRAILLE, ord(lower) - BRAILLE
    return chr(BRAILLE + (dots | more)) if 0 <= dots < 256 and 0 <= more < 256 else upper


def _runs(row: list[tuple[str, Role]]) -> Line:
    runs: Line = []
    for character, role in row:
        if runs and runs[-1][1] == role:
            runs[-1] = (runs[-1][0] + character, role)
        else:
            runs.append((character, role))
    return runs
