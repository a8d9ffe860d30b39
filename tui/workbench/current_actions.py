"""What keys do in the current view; those of the energy line move the bias line there."""

from __future__ import annotations

import math
import time
from dataclasses import replace

from tui.figures.cells import Glyphs
from tui.figures.current_figure import OVERLAYS, features_of
from tui.session.model import Session
from tui.session.read import overlay_temperatures
from tui.session.tables import CONDITIONS
from tui.workbench.current_view import CURRENT_HINT, STOPPED, CurrentView
from tui.workbench.document import Document
from tui.workbench.energy_actions import FINE, EnergyActions
from tui.workbench.panes import CurrentPane
from tui.workbench.typed import Refusal, number
from tui.workbench.values import as_range, set_value

BURST_PAUSE_S = 1.0
"""Moves of the bias line that follow each other within this are undone together."""
STEP_V = 0.01
"""Step of the bias line where there is no curve to take one from."""
ROUND = (1.0, 2.0, 5.0, 10.0)
NEAR_V = 1e-7
"""A feature within this is where the line is already."""
BIAS_V = as_range(CONDITIONS["bias_V"])


class CurrentActions(CurrentView, EnergyActions):
    """Actions on the current; on the energy line where the bands are shown."""

    def __init__(self, document: Document, glyphs: Glyphs) -> None:
        super().__init__(document, glyphs)
        self._moved: Session | None = None
        self._moved_at = 0.0

    def action_switch_view(self) -> None:
        """Show the current for the bands, or the bands again."""
        self.switch_view()

    def action_scale(self) -> None:
        """Show decades, or the current itself."""
        if self._is_current_shown():
            self.is_log = not self.is_log
            self.show_answer()

    def action_overlays(self) -> None:
        """Type the temperatures whose curves are laid over."""
        if not self._is_current_shown():
            return

        def accept(text: str) -> str:
            found = overlay_temperatures(text)
            if found is None:
                return 'temperatures in K with blanks between, as "77 4.2"'
            if len(found) > len(OVERLAYS):
                return f"at most {len(OVERLAYS)} can be told apart"
            typed = " ".join(text.split())
            self.become(replace(self.session, sweep=replace(self.session.sweep, overlay_K=typed)))
            return ""

        self.ask("temperatures laid over, in K:", self.session.sweep.overlay_K, accept)

    def action_break_off(self) -> None:
        """Leave the curve as far as it is."""
        if self.wanted is not None:
            self.stopped = self.wanted
            self.drop_current()
            self.say(STOPPED)
            self.show_answer()

    def action_compute_current(self) -> None:
        """Take up again what was broken off."""
        if self._is_current_shown():
            self.stopped = None
            self.ask_current()

    def action_level(self, direction: int) -> None:
        """Go to the next feature of the curve; in the bands to the next level."""
        if self.shows_current:
            self._next_feature(direction)
        else:
            super().action_level(direction)

    def action_line(self, rows: int) -> None:
        """Move the line by a step."""
        if self.shows_current:
            self._step_bias(rows, 1.0)
        else:
            super().action_line(rows)

    def action_fine_line(self, rows: int) -> None:
        """Move the line by a tenth of a step."""
        if self.shows_current:
            self._step_bias(rows, FINE)
        else:
            super().action_fine_line(rows)

    def action_energy(self) -> None:
        """Type a bias; in the bands an energy."""
        if not self.shows_current:
            super().action_energy()
            return

        def accept(text: str) -> str:
            try:
                self._take_bias(number(text, "V", BIAS_V))
            except Refusal as refusal:
                return str(refusal)
            return ""

        self.ask("bias in V:", f"{self.bias_V:.6g}", accept)

    def _is_current_shown(self) -> bool:
        if not self.shows_current:
            self.say("this key is for the current view; c shows it")
        return self.shows_current

    def _next_feature(self, direction: int) -> None:
        """Jump to the next onset, peak or valley in the direction of the bias."""
        sweep = None if self.news is None else self.news.sweep
        if sweep is None or self.is_old or not sweep.refined:
            self.say("peaks and valleys are not known yet", "trouble")
            return
        places = [(feature.bias_V, feature.said) for feature in features_of(sweep)]
        for n, region in enumerate(sweep.regions, start=1):
            if region.onset_V is not None and sweep.from_V <= region.onset_V <= sweep.to_V:
                places.append((region.onset_V, f"onset before P{n}"))
        ahead = [p for p in places if (p[0] - self.bias_V) * direction > NEAR_V]
        if not ahead:
            self.say("there is no further onset, peak or valley this way")
            return
        bias, said = min(ahead, key=lambda place: abs(place[0] - self.bias_V))
        self._take_bias(float(f"{bias:.7f}"))
        self.say(f"{said} at {bias:.5f} V")

    def _step_bias(self, steps: int, share: float) -> None:
        """Move the bias line to the next multiple of a round step, about a column wide."""
        base = self.query_one("#current", CurrentPane).base
        step = share * (STEP_V if base is None else _round_step(base.bias_step_V()))
        low, high = BIAS_V.low, BIAS_V.high
        if base is not None:
            low, high = base.limits.left, base.limits.right
        at = self.bias_V / step
        to = math.floor(at + 1e-6) + steps if steps > 0 else math.ceil(at - 1e-6) + steps
        self._take_bias(min(max(float(f"{to * step:.9g}"), low), high))
        self.say(CURRENT_HINT)

    def _take_bias(self, bias_V: float) -> None:
        """Make a bias the session's; moves that follow each other quickly are one edit."""
        now = time.monotonic()
        joins = self._moved is self.session and now - self._moved_at < BURST_PAUSE_S
        session = set_value(self.session, ("conditions", 0), "bias_V", bias_V)
        self.document.become(session, joins=joins)
        self._moved, self._moved_at = self.session, now
        self.session_changed()


def _round_step(least_V: float) -> float:
    """Give the smallest of 1, 2 and 5 times a power of ten that is not less."""
    power = 10.0 ** math.floor(math.log10(least_V))
    return next(power * r for r in ROUND if power * r >= least_V * (1.0 - 1e-9))
