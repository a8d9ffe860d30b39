"""The published material parameters, read once from ``catalogue.toml`` and checked.

The file says for each value where it was published. What the catalogue holds is for nine binary
compounds, at the points Gamma, X and L; what an alloy makes of them is the business of `materials`.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, fields
from functools import cache
from typing import Any, Literal

from physics.errors import MaterialError
from physics.formula import GROUP_III, GROUP_V

FILE_NAME = "catalogue.toml"

MEV_PER_EV = 1000.0


@dataclass(frozen=True)
class Value:
    """One number; its unit is in the name of the field that holds it."""

    value: float
    source: str


@dataclass(frozen=True)
class Gap:
    """A gap and the law by which it changes with temperature."""

    law: Literal["varshni", "linear", "coth"]
    zero_K_eV: float
    """The gap at 0 K."""
    strength: float
    """alpha in eV/K (varshni, linear) or the amplitude in eV (coth)."""
    scale_K: float
    """beta (varshni) or theta (coth); 0 for the linear law."""
    source: str


@dataclass(frozen=True)
class Bowing:
    """Bowing ``constant + per_x x`` of the alloy of two compounds, x the share of the first."""

    constant: float
    per_x: float
    source: str


@dataclass(frozen=True)
class Binary:
    """One compound, unstrained."""

    gamma_gap_eV: Gap
    x_gap_eV: Gap
    l_gap_eV: Gap
    valence_offset_eV: Value
    """Valence-band edge on the scale common to all compounds."""
    mass: Value
    """Electron mass at the bottom of the Gamma valley, in m0."""
    permittivity: Value
    """Static, relative."""
    lattice_nm: Value
    """At 300 K."""
    lattice_slope_nm_per_K: Value
    c11_GPa: Value
    """Elastic constants, with `c12_GPa` and `c44_GPa`."""
    c12_GPa: Value
    c44_GPa: Value
    a_c_eV: Value
    """Hydrostatic deformation potential of the conduction edge at Gamma."""
    a_v_eV: Value
    """The same of the valence edge; negative where it falls under compression (`strain`)."""
    b_eV: Value
    """Shear deformation potential of the valence band."""


QUANTITIES = tuple(field.name for field in fields(Binary))

Pair = tuple[str, str]


@dataclass(frozen=True)
class Catalogue:
    """All that the file holds."""

    sources: Mapping[str, str]
    """Short name of a source to its full reference."""
    binaries: Mapping[str, Binary]
    """Compound, as ``"GaAs"``, to its parameters."""
    bowings: Mapping[Pair, Mapping[str, Bowing]]
    """Pair of compounds with one element in common to the quantities that bow."""


@cache
def catalogue() -> Catalogue:
    """Read the package's own catalogue; the same object at every call."""
    # Imported at use: it costs more than the rest of this module, and many calls need no material.
    from pathlib import Path

    return read_catalogue(Path(__file__).with_name(FILE_NAME).read_text(encoding="utf-8"))


def read_catalogue(text: str) -> Catalogue:
    """Read a catalogue and check it.

    Parameters
    ----------
    text : str
        TOML with the tables ``source``, ``binary`` and ``bowing``.

    Raises
    ------
    MaterialError
        The text is no TOML, a compound or a value is missing, a key or a source is unknown, or a
        number is out of the question.
    """
    import tomllib  # at use, as above

    try:
        tables = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise MaterialError(f"{FILE_NAME}: {error}; correct the TOML") from error
    _require_keys("the file", tables, {"source", "binary", "bowing"})
    _require_table("[source]", tables["source"])
    _require_table("[bowing]", tables["bowing"])
    sources = {str(key): str(reference) for key, reference in tables["source"].items()}
    _require_keys("[binary]", tables["binary"], {a + b for a in GROUP_III for b in GROUP_V})
    return Catalogue(
        sources=sources,
        binaries={name: _binary(name, row, sources) for name, row in tables["binary"].items()},
        bowings={
            _pair(name): _bowing(name, row, sources) for name, row in tables["bowing"].items()
        },
    )


def gap_eV(gap: Gap, temperature_K: float) -> float:
    """Gap at a temperature.

    Y. P. Varshni, Physica 34, 149 (1967); the linear law (X in InP) and the hyperbolic cotangent
    (Gamma in GaP) as I. Vurgaftman et al., J. Appl. Phys. 89, 5815 (2001) give them.

    Parameters
    ----------
    gap : Gap
        A row of the catalogue.
    temperature_K : float
        At least 0.
    """
    if gap.law == "linear":
        return gap.zero_K_eV - gap.strength * temperature_K
    if gap.law == "varshni":
        return gap.zero_K_eV - gap.strength * temperature_K**2 / (temperature_K + gap.scale_K)
    if temperature_K == 0.0:
        return gap.zero_K_eV
    return gap.zero_K_eV + gap.strength * (1.0 - 1.0 / math.tanh(gap.scale_K / temperature_K))


_GAPS = ("gamma_gap_eV", "x_gap_eV", "l_gap_eV")
_GAP_KEYS = {
    "varshni": {"law", "zero_K", "alpha_meV_per_K", "beta_K", "source"},
    "linear": {"law", "zero_K", "alpha_meV_per_K", "source"},
    "coth": {"law", "zero_K", "amplitude_eV", "theta_K", "source"},
}

# Wide enough for any III-V compound, narrow enough to catch a value in the wrong unit.
_RANGES = {
    "valence_offset_eV": (-5.0, 5.0),
    "mass": (1e-3, 2.0),
    "permittivity": (1.0, 100.0),
    "lattice_nm": (0.3, 0.8),
    "lattice_slope_nm_per_K": (0.0, 1e-4),
    "c11_GPa": (10.0, 1000.0),
    "c12_GPa": (1.0, 1000.0),
    "c44_GPa": (1.0, 1000.0),
    "a_c_eV": (-20.0, 20.0),
    "a_v_eV": (-20.0, 20.0),
    "b_eV": (-10.0, 10.0),
    "zero_K": (1e-3, 10.0),
    "alpha_meV_per_K": (0.0, 5.0),
    "beta_K": (1.0, 5000.0),
    "amplitude_eV": (0.0, 5.0),
    "theta_K": (1.0, 5000.0),
    "C": (-20.0, 20.0),
    "C_per_x": (-20.0, 20.0),
}


def _binary(name: str, row: Any, sources: Mapping[str, str]) -> Binary:
    where = f"[binary.{name}]"
    _require_keys(where, row, set(QUANTITIES))
    rows: dict[str, Any] = {
        key: (_gap if key in _GAPS else _value)(where, row, key, sources) for key in QUANTITIES
    }
    return Binary(**rows)


def _value(where: str, row: Any, key: str, sources: Mapping[str, str]) -> Value:
    here = f"{where} {key}"
    _require_keys(here, row[key], {"value", "source"})
    number = _number(here, row[key], "value", _RANGES[key])
    return Value(number, _source(here, row[key], sources))


def _gap(where: str, row: Any, key: str, sources: Mapping[str, str]) -> Gap:
    here = f"{where} {key}"
    entry = row[key]
    law = entry.get("law") if isinstance(entry, dict) else None
    if law not in list(_GAP_KEYS):
        raise MaterialError(f"{FILE_NAME}: {here}: law is {law!r}; use one of {sorted(_GAP_KEYS)}")
    _require_keys(here, entry, _GAP_KEYS[law])
    number = {
        name: _number(here, entry, name, _RANGES[name])
        for name in _GAP_KEYS[law] - {"law", "source"}
    }
    alpha = number.get("alpha_meV_per_K", 0.0) / MEV_PER_EV
    return Gap(
        law=law,
        zero_K_eV=number["zero_K"],
        strength=number.get("amplitude_eV", alpha),
        scale_K=number.get("beta_K", number.get("theta_K", 0.0)),
        source=_source(here, entry, sources),
    )


def _bowing(name: str, row: Any, sources: Mapping[str, str]) -> dict[str, Bowing]:
    where = f"[bowing.{name}]"
    bowings = {}
    _require_keys(where, row, set(), optional=set(QUANTITIES))
    for quantity, entry in row.items():
        here = f"{where} {quantity}"
        _require_keys(here, entry, {"C", "source"}, optional={"C_per_x"})
        bowings[quantity] = Bowing(
            constant=_number(here, entry, "C", _RANGES["C"]),
            per_x=_number(here, {"C_per_x": 0.0} | entry, "C_per_x", _RANGES["C_per_x"]),
            source=_source(here, entry, sources),
        )
    return bowings


def _pair(name: str) -> Pair:
    """Split ``"AlAs-GaAs"``; the pair has one element in common and is in the elements' order."""
    pairs = {(a + c, b + c) for c in GROUP_V for a, b in _ordered(GROUP_III)}
    pairs |= {(c + a, c + b) for c in GROUP_III for a, b in _ordered(GROUP_V)}
    first, _, second = name.partition("-")
    if (first, second) not in pairs:
        allowed = "name two compounds with one element in common, in the order Al Ga In and P As Sb"
        raise MaterialError(f"{FILE_NAME}: [bowing.{name}]: found {name!r}; {allowed}")
    return first, second


def _ordered(elements: tuple[str, ...]) -> list[Pair]:
    return [(a, b) for i, a in enumerate(elements) for b in elements[i + 1 :]]


def _require_keys(
    where: str, table: Any, required: set[str], optional: set[str] | None = None
) -> None:
    _require_table(where, table)
    missing = sorted(required - table.keys())
    if missing:
        raise MaterialError(f"{FILE_NAME}: {where}: {missing[0]!r} is missing; add it")
    unknown = sorted(table.keys() - required - (optional or set()))
    if unknown:
        allowed = ", ".join(sorted(required | (optional or set())))
        raise MaterialError(f"{FILE_NAME}: {where}: {unknown[0]!r} is unknown; keys are {allowed}")


def _require_table(where: str, table: Any) -> None:
    if not isinstance(table, dict):
        raise MaterialError(f"{FILE_NAME}: {where}: found {table!r}; a table belongs here")


def _number(where: str, table: Mapping[str, Any], key: str, span: tuple[float, float]) -> float:
    number = table[key]
    if (
        isinstance(number, int | float)
        and not isinstance(number, bool)
        and span[0] <= number <= span[1]
    ):
        return float(number)
    raise MaterialError(
        f"{FILE_NAME}: {where}: {key} is {number!r}; a number from {span[0]:g} to {span[1]:g}"
    )


def _source(where: str, table: Mapping[str, Any], sources: Mapping[str, str]) -> str:
    source = table["source"]
    if source not in list(sources):
        allowed = f"one of {', '.join(sorted(sources))}, or a new row under [source]"
        raise MaterialError(f"{FILE_NAME}: {where}: source is {source!r}; {allowed}")
    return str(source)
