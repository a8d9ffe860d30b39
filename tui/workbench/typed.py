"""What a user types into a field: a number with or without a unit."""

from __future__ import annotations

import math
import re

from physics.ranges import Range
from tui.session.refusal import has_controls

_NUMBER = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*([A-Za-z^0-9/-]*)\s*$")
UNITS: dict[str, dict[str, float]] = {
    "nm": {"": 1.0, "nm": 1.0, "A": 0.1, "um": 1e3},
    "ml": {"": 1.0, "ml": 1.0, "ML": 1.0},
    "eV": {"": 1.0, "eV": 1.0, "meV": 1e-3, "ueV": 1e-6},
    "V": {"": 1.0, "V": 1.0, "mV": 1e-3},
    "K": {"": 1.0, "K": 1.0},
    "m0": {"": 1.0, "m0": 1.0},
    "cm-3": {"": 1.0, "cm-3": 1.0, "cm^-3": 1.0},
    "s": {"": 1.0, "s": 1.0, "ps": 1e-12, "fs": 1e-15},
    "um2": {"": 1.0, "um2": 1.0, "um^2": 1.0},
    "ohm": {"": 1.0, "ohm": 1.0, "kohm": 1e3},
    "fF": {"": 1.0, "fF": 1.0, "pF": 1e3},
    "": {"": 1.0},
}


class Refusal(Exception):  # noqa: N818  not a fault: the user is told and may go on typing
    """A typed value that cannot be taken, in words for the user."""


def number(text: str, unit: str, allowed: Range) -> float:
    """Read a number, in its field's unit unless another is written behind it.

    Raises
    ------
    Refusal
        It is no number, has an unknown unit, or lies outside the range.
    """
    match = _NUMBER.match(text)
    if match is None:
        raise Refusal(f"a number is expected; {allowed.allowed}")
    scale = UNITS[unit].get(match[2])
    if scale is None:
        known = ", ".join(name for name in UNITS[unit] if name) or "no unit"
        raise Refusal(f"the unit {match[2]} does not fit here; known: {known}")
    value = float(match[1]) * scale
    # What is typed as 80 meV is 0.08 eV, not its nearest product.
    value = float(f"{value:.15g}") if math.isfinite(value) and scale != 1.0 else value
    if not allowed.holds(value):
        raise Refusal(allowed.allowed)
    return value


def unit_of(key: str) -> str:
    """Find a field's unit, from its name."""
    for unit, names in _UNIT_KEYS.items():
        if key in names:
            return unit
    return ""


_UNIT_KEYS = {
    "nm": ("thickness_nm", "monolayer_nm"),
    "ml": ("thickness_ml",),
    "eV": (
        *("edge_eV", "to_edge_eV", "fermi_eV", "gap_eV", "to_gap_eV"),
        *("from_eV", "to_eV", "max_width_eV", "dephasing_eV"),
    ),
    "V": ("bias_V", "from_V", "to_V"),
    "K": ("temperature_K",),
    "m0": ("mass", "to_mass"),
    "cm-3": ("donors_cm3",),
    "s": ("scattering_time_s",),
    "um2": ("mesa_um2",),
    "ohm": ("series_ohm",),
    "fF": ("parallel_fF",),
}


def as_line(text: str) -> str:
    """Write a text of several lines on one, for it to be edited; see `from_line`."""
    return text.replace("\\", "\\\\").replace("\n", "\\n").replace("\t", "\\t")


def from_line(line: str) -> str:
    r"""Read a text of several lines from one: \n is a new line, \t a tab, \\ a backslash.

    Raises
    ------
    Refusal
        There are control characters in it.
    """
    meant = {"n": "\n", "t": "\t", "\\": "\\"}
    text = re.sub(r"\\(.)", lambda found: meant.get(found[1], found[0]), line)
    if has_controls(text, lines=True):
        raise Refusal("control characters cannot be part of a text")
    return text
