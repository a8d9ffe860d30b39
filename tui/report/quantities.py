"""Numbers with a unit that suits their size, as a reader wants them."""

from __future__ import annotations

import math

_ENERGIES = (
    (1.0, "eV"),
    (1e-3, "meV"),
    (1e-6, "ueV"),
    (1e-9, "neV"),
    (1e-12, "peV"),
)
_TIMES = ((1.0, "s"), (1e-3, "ms"), (1e-6, "us"), (1e-9, "ns"), (1e-12, "ps"), (1e-15, "fs"))
_LARGEST_SECONDS = 1e5


def energy(value_eV: float, digits: int = 4) -> str:
    """Write an energy; below 1 peV as a power of ten in eV."""
    return _with_unit(value_eV, _ENERGIES, digits, "eV")


def width(value_eV: float, log10_eV: float, digits: int = 4) -> str:
    """Write a width, from its logarithm where the number itself underflows."""
    if value_eV == 0.0 and math.isfinite(log10_eV):
        return f"{_power(log10_eV, digits)} eV"
    return "none" if value_eV == 0.0 else energy(value_eV, digits)


def duration(value_s: float, digits: int = 4) -> str:
    """Write a time."""
    if not math.isfinite(value_s):
        return "for ever" if value_s == math.inf else "-"
    if value_s >= _LARGEST_SECONDS:
        return f"{value_s:.{digits - 1}e} s"
    return _with_unit(value_s, _TIMES, digits, "s")


def probability(value: float, log10_value: float, digits: int = 4) -> str:
    """Write a transmission, by its logarithm where it is tiny."""
    if value >= 1e-3:
        return f"{value:.{digits}f}"
    if math.isinf(log10_value):
        return "0"
    return _power(log10_value, digits - 1)


def _with_unit(value: float, units: tuple[tuple[float, str], ...], digits: int, plain: str) -> str:
    size = abs(value)
    if size == 0.0:
        return f"0 {plain}"
    for scale, unit in units:
        if size >= scale * (1.0 - 0.5 * 10.0**-digits):
            return f"{_significant(value / scale, digits)} {unit}"
    smallest, unit = units[-1]
    if size >= 1e-3 * smallest:
        return f"{_significant(value / smallest, digits)} {unit}"
    return f"{value:.{digits - 1}e} {plain}"


def _significant(value: float, digits: int) -> str:
    exponent = int(f"{value:.{digits - 1}e}".partition("e")[2])  # 9.9996 is written 10.00
    return f"{value:.{max(0, digits - 1 - max(0, exponent))}f}"


def _power(log10_value: float, digits: int) -> str:
    """Write a number that may be too small for a double, by its logarithm."""
    exponent = math.floor(log10_value)
    mantissa, _, carry = f"{10.0 ** (log10_value - exponent):.{digits - 1}e}".partition("e")
    return f"{mantissa}e{exponent + int(carry)}"
