"""Thin widgets: they hold lines that were made elsewhere and hand them out as strips."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence

from rich.segment import Segment
from textual.geometry import Region, Size
from textual.strip import Strip
from textual.timer import Timer
from textual.widget import Widget

from tui.bias_point import BiasPoint
from tui.figures.cells import Glyphs
from tui.figures.current_figure import CurrentBase, Scene, current_base, current_figure
from tui.figures.energy_figure import MIN_HEIGHT, MIN_WIDTH, Base, base_figure, figure
from tui.reading import Reading
from tui.study import Study
from tui.workbench.look import STYLES, takes_more
from tui.workbench.readout import dimmed

BEHIND_PAUSE_S = 0.1
"""How long a slow link is left alone before it is looked at again."""
StyledLines = Sequence[Sequence[tuple[str, str]]]


class Pane(Widget):
    """A widget that shows styled lines as they are."""

    can_focus = False

    def __init__(self, *, id: str) -> None:  # noqa: A002  Textual's own name
        super().__init__(id=id)
        self._strips: list[Strip] = []
        self._stale: set[int] = set()
        self._waiting: Timer | None = None

    def show(self, lines: StyledLines) -> None:
        """Show these lines; the screen is touched only where they differ from what is there."""
        strips = [
            Strip([Segment(text, STYLES[role]) for text, role in line if text]) for line in lines
        ]
        changed = [
            n
            for n in range(max(len(strips), len(self._strips)))
            if n >= len(strips) or n >= len(self._strips) or strips[n] != self._strips[n]
        ]
        grown = len(strips) != len(self._strips)
        self._strips = strips
        if grown and self.styles.height is not None and self.styles.height.is_auto:
            self.refresh(layout=True)
        elif changed:
            self._stale.update(changed)
            if self._waiting is None:
                self._paint()

    def _paint(self) -> None:
        """Have the lines drawn that differ, once the terminal has taken what was sent before."""
        self._waiting = None
        if takes_more():
            width = max(1, self.size.width)
            self.refresh(*(Region(0, n, width, 1) for n in sorted(self._stale)))
            self._stale.clear()
        else:
            self._waiting = self.set_timer(BEHIND_PAUSE_S, self._paint)

    def render_line(self, y: int) -> Strip:
        """Hand a line out, filled up to the pane's width."""
        strip = self._strips[y] if y < len(self._strips) else Strip.blank(0)
        return strip.adjust_cell_length(self.size.width)

    def get_content_height(self, container: Size, viewport: Size, width: int) -> int:  # noqa: ARG002
        """As many lines as are shown."""
        return len(self._strips)


class FigurePane(Pane):
    """The figure; what does not depend on the energy in hand is drawn once and kept."""

    def __init__(self, glyphs: Glyphs, *, id: str) -> None:  # noqa: A002
        super().__init__(id=id)
        self.glyphs = glyphs
        self.base: Base | None = None

    def draw(self, study: Study, reading: Reading | None, *, is_old: bool = False) -> None:
        """Draw an answer, fainter where it answers something else than is there now."""
        width, height = self.size
        if width < MIN_WIDTH or height < MIN_HEIGHT:
            self.base = None
            self.show([[(f"the figure needs {MIN_WIDTH} x {MIN_HEIGHT} cells", "faint")]])
            return
        base = self.base
        if base is None or base.study is not study or self._size_of(base) != (width, height):
            base = self.base = base_figure(study, width, height, self.glyphs)
        lines = figure(base, reading).lines()
        self.show(dimmed(lines) if is_old else lines)

    @staticmethod
    def _size_of(base: Base) -> tuple[int, int]:
        return base.cells.width, base.cells.height


class CurrentPane(Pane):
    """The figure of a current; what does not depend on the bias in hand is drawn once and kept."""

    def __init__(self, glyphs: Glyphs, *, id: str) -> None:  # noqa: A002
        super().__init__(id=id)
        self.glyphs = glyphs
        self.base: CurrentBase | None = None

    def draw(
        self, scene: Scene, bias_V: float, point: BiasPoint | None, *, is_old: bool = False
    ) -> None:
        """Draw a current, fainter where it is that of something else than is there now."""
        width, height = self.size
        if width < MIN_WIDTH or height < MIN_HEIGHT:
            self.base = None
            self.show([[(f"the figure needs {MIN_WIDTH} x {MIN_HEIGHT} cells", "faint")]])
            return
        base = self.base
        if base is None or base.scene is not scene or self._size_of(base) != (width, height):
            base = self.base = current_base(scene, width, height, self.glyphs)
        current = None if point is None else point.current_density_A_per_cm2
        lines = current_figure(base, bias_V, current).lines()
        self.show(dimmed(lines) if is_old else lines)

    def say(self, text: str, role: str) -> None:
        """Say why there is no figure."""
        self.base = None
        lines = textwrap.wrap(text, max(20, self.size.width - 2))
        self.show([[("", "")], *([(f" {line}", role)] for line in lines)])

    @staticmethod
    def _size_of(base: CurrentBase) -> tuple[int, int]:
        return base.cells.width, base.cells.height
