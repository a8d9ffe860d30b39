"""Steps of values: how far one goes, and to what a formula or a choice goes."""

from __future__ import annotations

import re

from tui.workbench.typed import Refusal

STEPS: dict[str, tuple[float, float]] = {
    "thickness_nm": (0.1, 0.01),
    "thickness_ml": (1.0, 0.5),
    "edge_eV": (0.01, 0.001),
    "to_edge_eV": (0.01, 0.001),
    "fermi_eV": (0.01, 0.001),
    "from_eV": (0.01, 0.001),
    "to_eV": (0.01, 0.001),
    "mass": (0.001, 0.0001),
    "to_mass": (0.001, 0.0001),
    "bias_V": (0.01, 0.001),
    "temperature_K": (10.0, 1.0),
    "permittivity": (0.1, 0.01),
    "fraction": (0.01, 0.001),
    "gap_eV": (0.01, 0.001),
    "to_gap_eV": (0.01, 0.001),
    "dephasing_eV": (0.001, 0.0001),
    "from_V": (0.1, 0.01),
    "to_V": (0.1, 0.01),
    "mesa_um2": (1.0, 0.1),
    "series_ohm": (1.0, 0.1),
    "parallel_fF": (1.0, 0.1),
}
"""What one step and one fine step add."""
FACTORS: dict[str, tuple[float, float]] = {
    "donors_cm3": (10.0**0.1, 10.0**0.01),
    "max_width_eV": (2.0, 1.1),
    "scattering_time_s": (10.0**0.1, 10.0**0.01),
    "mobility_cm2_Vs": (10.0**0.1, 10.0**0.01),
}
"""What they multiply by, where a quantity spans decades."""
FIRST_DONORS_CM3 = 1e16
DECIMALS = 6
"""Decimals of a fraction that was stepped."""
_ELEMENT, _FRACTION = r"([A-Z][a-z]?)", r"(0?\.\d+)"
_ALLOY = re.compile(rf"{_ELEMENT}?{_ELEMENT}{_FRACTION}{_ELEMENT}{_FRACTION}{_ELEMENT}?", re.ASCII)


def next_choice(choices: tuple[str, ...], chosen: str, direction: int) -> str:
    """Go to the next of a few choices, round and round.

    Raises
    ------
    Refusal
        There is only one.
    """
    if len(choices) < 2:
        raise Refusal(f"this version has one only: {choices[0]}")
    return choices[(choices.index(chosen) + direction) % len(choices)]


def stepped_formula(formula: str, by: float) -> str:
    """Give an alloy's first fraction more, and the one that goes with it less.

    Raises
    ------
    Refusal
        The formula is not that of two elements that share a sublattice, or the step would leave
        only one of them.
    """
    match = _ALLOY.fullmatch(formula)
    if match is None:
        raise Refusal("only an alloy of two fractions, as Al0.3Ga0.7As, can be stepped; type it")
    before, first, written, second, other, after = (part or "" for part in match.groups())
    fraction = round(float(written) + by, DECIMALS)
    if abs(float(written) + float(other) - 1.0) > 10.0**-DECIMALS or not 0.0 < fraction < 1.0:
        raise Refusal(f"the fractions lie between 0 and 1, and sum to 1; type {formula} anew")
    return f"{before}{first}{_digits(fraction)}{second}{_digits(1.0 - fraction)}{after}"


def _digits(fraction: float) -> str:
    return f"{fraction:.{DECIMALS}f}".rstrip("0")
