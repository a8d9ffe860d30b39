"""What keys do to the energy line."""

from __future__ import annotations

from tui.reading import Reading
from tui.session.tables import ENERGY_EV
from tui.workbench.bench import Bench
from tui.workbench.solver import Hand
from tui.workbench.typed import Refusal, number

FINE = 0.1


class EnergyActions(Bench):
    """Actions on the energy in hand."""

    def action_level(self, direction: int) -> None:
        """Snap to the next level above or below."""
        if self.study is None or self.reading is None:
            return
        levels = self.study.levels.levels
        if not levels:
            self.say("there is no level in the window", "trouble")
            return
        if self.reading.number is not None and self.hand.energy_eV is None:
            wanted = (self.hand.number or self.reading.number) + direction
        else:
            here = self._here(self.reading)
            below = sum(level.energy_eV < here for level in levels)
            wanted = below + 1 if direction > 0 else below
        self._take_hand(Hand(number=min(max(wanted, 1), len(levels))))

    def action_line(self, rows: int) -> None:
        """Move the line by rows of the figure."""
        self._shift(float(rows))

    def action_fine_line(self, rows: int) -> None:
        """Move the line by tenths of a row."""
        self._shift(FINE * rows)

    def action_energy(self) -> None:
        """Type an energy."""

        def accept(text: str) -> str:
            try:
                energy = number(text, "eV", ENERGY_EV)
            except Refusal as refusal:
                return str(refusal)
            self._take_hand(Hand(energy_eV=energy))
            return ""

        here = self.reading.energy_eV if self.reading is not None else 0.0
        self.ask("energy in eV:", f"{here:.6g}", accept)

    def _shift(self, rows: float) -> None:
        if self.study is None or self.reading is None:
            return
        scene = self.study.scene
        from tui.workbench.panes import FigurePane

        base = self.query_one("#figure", FigurePane).base
        step = base.energy_step_eV() if base is not None else 0.02 * (scene.to_eV - scene.from_eV)
        here = self._here(self.reading)
        energy = min(max(here + rows * step, scene.from_eV), scene.to_eV)
        self._take_hand(Hand(energy_eV=float(f"{energy:.9g}")))

    def _here(self, reading: Reading) -> float:
        """Give the energy asked for last, which may not be read off yet."""
        return reading.energy_eV if self.hand.energy_eV is None else self.hand.energy_eV

    def _take_hand(self, hand: Hand) -> None:
        self.hand = hand
        self.compute()
