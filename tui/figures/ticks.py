"""Round numbers for axes."""

from __future__ import annotations

import math

STEPS = (1.0, 2.0, 5.0, 10.0)


def round_ticks(low: float, high: float, most: int) -> list[float]:
    """Give at most ``most`` round values from low to high, evenly spaced."""
    if not high > low or most < 1:
        return []
    raw = (high - low) / max(1, most)
    power = 10.0 ** math.floor(math.log10(raw))
    step = next(power * s for s in STEPS if power * s >= raw * (1.0 - 1e-9))
    first = math.ceil(low / step - 1e-9)
    last = math.floor(high / step + 1e-9)
    return [n * step for n in range(first, last + 1)]


def tick_text(value: float, ticks: list[float]) -> str:
    """Write a tick with the digits that tell it from its neighbours."""
    step = ticks[1] - ticks[0] if len(ticks) > 1 else abs(value) or 1.0
    digits = max(0, -math.floor(math.log10(step) + 1e-9))
    text = f"{value:.{digits}f}"
    return text.lstrip("-") if float(text) == 0.0 else text
