"""Amounts of any unit with the prefix that suits their size, in ASCII."""

from __future__ import annotations

import math

PREFIXES = (
    (1e12, "T"),
    (1e9, "G"),
    (1e6, "M"),
    (1e3, "k"),
    (1.0, ""),
    (1e-3, "m"),
    (1e-6, "u"),
    (1e-9, "n"),
    (1e-12, "p"),
    (1e-15, "f"),
    (1e-18, "a"),
)


def prefix_of(size: float) -> tuple[float, str]:
    """Find the factor and the prefix for a size; none where even the last is too large."""
    if not math.isfinite(size) or size >= 1e3 * PREFIXES[0][0]:
        return 1.0, ""
    fits = (item for item in PREFIXES if size >= item[0] * (1.0 - 5e-5))
    return next(fits, (1.0, ""))


def amount(value: float, unit: str, digits: int = 4) -> str:
    """Write an amount, as ``amount(13970.0, "A/cm2")`` writes ``13.97 kA/cm2``."""
    if value == 0.0 or not math.isfinite(value):
        return f"{value:.0f} {unit}"
    scale, prefix = prefix_of(abs(value))
    if scale == 1.0 and not 1e-3 <= abs(value) < 1e15:
        return f"{value:.{digits - 1}e} {unit}"
    exponent = int(f"{value / scale:.{digits - 1}e}".partition("e")[2])
    return f"{value / scale:.{max(0, digits - 1 - exponent)}f} {prefix}{unit}"
