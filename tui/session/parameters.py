"""Numbers of a session by name: what scans vary, tolerances shake and aims move.

A parameter is named as refusals name it: ``layer 3 thickness_nm``, ``left donors_cm3``,
``conditions bias_V``, ``material Mine edge_eV``; a layer also by its label, ``layer "first barrier"
thickness_ml``, and several layers that move together as ``layer 2,4 thickness_ml``. The key
``composition`` is the first fraction of an alloy of two, ``0.3`` of Al0.3Ga0.7As, whose other
fraction makes up for it.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, replace
from typing import Any

from physics.ranges import Range
from tui.session import tables
from tui.session.lines import KeyPath
from tui.session.model import Session
from tui.session.refusal import SessionError, named, printable, shown

COMPOSITION = "composition"
FRACTION = Range(0.0, 1.0, "a fraction lies between 0 and 1, ends left out", open_below=True)
DIGITS = 9
"""Decimals of a fraction that is written into a formula."""
TABLES: dict[str, tables.Table] = {
    "conditions": tables.CONDITIONS,
    "left": tables.CONTACT,
    "right": tables.CONTACT,
    "layer": tables.LAYER,
    "material": tables.MATERIAL,
    "device": tables.DEVICE,
}
AGAINST = {
    "thickness_nm": ("thickness_ml",),
    "thickness_ml": ("thickness_nm",),
    "edge_eV": ("material",),
    "mass": ("material",),
    "to_edge_eV": ("to_material",),
    "to_mass": ("to_material",),
    "donors_cm3": ("fermi_eV",),
    "fermi_eV": ("donors_cm3",),
    "dephasing_eV": ("scattering_time_s", "mobility_cm2_Vs"),
    "scattering_time_s": ("dephasing_eV", "mobility_cm2_Vs"),
    "mobility_cm2_Vs": ("dephasing_eV", "scattering_time_s"),
}
"""Values that a number stands against, and takes away."""
_ELEMENT, _NUMBER = r"([A-Z][a-z]?)", r"(0?\.\d+)"
_ALLOY = re.compile(rf"{_ELEMENT}?{_ELEMENT}{_NUMBER}{_ELEMENT}{_NUMBER}{_ELEMENT}?", re.ASCII)
_NAME = re.compile(r'(\w+)(?:\s+("[^"]*"|\S+))?\s+(\w+)', re.ASCII)


@dataclass(frozen=True)
class Parameter:
    """One number of a session, or the same number of several layers."""

    text: str
    """As it was named."""
    table: str
    members: tuple[int | str, ...]
    """Layers counted from 0, or the name of a material; one empty text for other tables."""
    key: str

    @property
    def range(self) -> Range:
        """What the number may be."""
        if self.key == COMPOSITION:
            return FRACTION
        rule = TABLES[self.table][self.key]
        if not isinstance(rule, Range):
            raise TypeError(rule)
        return rule


def parameter(text: str, session: Session, path: KeyPath = ()) -> Parameter:
    """Find a parameter by its name.

    Parameters
    ----------
    path : tuple
        Where in the session text the name stands, for a refusal.

    Raises
    ------
    SessionError
        Nothing in the session goes by that name.
    """
    match = _NAME.fullmatch(text.strip())
    table, which, key = match.groups() if match else (text.strip(), None, "")
    if table not in TABLES:
        known = ", ".join(TABLES)
        raise _refused(text, f'write a table and a key, as "layer 2 thickness_nm"; {known}', path)
    members = _members(text, table, which, session, path)
    numbers = [name for name, rule in TABLES[table].items() if isinstance(rule, Range)]
    allowed = [*numbers, COMPOSITION] if table in ("layer", "left", "right") else numbers
    if key not in allowed:
        raise _refused(text, f"{table} has {', '.join(allowed)}", path)
    return Parameter(text.strip(), table, members, key)


def value_of(wanted: Parameter, session: Session) -> float:
    """Look the number up; of several layers, the first one's.

    Raises
    ------
    SessionError
        The session does not state it.
    """
    entry = _entry(session, wanted.table, wanted.members[0])
    if wanted.key == COMPOSITION:
        return _fraction(wanted, entry.material)
    value = getattr(entry, wanted.key)
    if value is None:
        raise _refused(wanted.text, "the session does not state it; write its value first", ())
    return float(value)


def with_value(wanted: Parameter, session: Session, value: float) -> Session:
    """Put a number in, and take away what it stands against.

    Raises
    ------
    SessionError
        The number is out of its range.
    """
    if not wanted.range.holds(value):
        raise SessionError(wanted.text, f"is {value:.9g}", wanted.range.allowed)
    for member in wanted.members:
        entry = _entry(session, wanted.table, member)
        changes: dict[str, Any] = {wanted.key: value}
        if wanted.key == COMPOSITION:
            changes = {"material": _with_fraction(wanted, entry.material, value)}
        changes |= {other: None for other in AGAINST.get(wanted.key, ()) if hasattr(entry, other)}
        session = _with_entry(session, wanted.table, member, replace(entry, **changes))
    return session


def _members(
    text: str, table: str, which: str | None, session: Session, path: KeyPath
) -> tuple[int | str, ...]:
    if table == "layer":
        return _layers(text, which, session, path)
    if table == "material":
        names = [entry.name for entry in session.materials]
        name = (which or "").strip('"')
        if name not in names:
            raise _refused(text, f"own materials are {', '.join(map(named, names))}", path)
        return (name,)
    if which is not None:
        raise _refused(text, f"there is only one table {table}", path)
    return ("",)


def _layers(text: str, which: str | None, session: Session, path: KeyPath) -> tuple[int, ...]:
    """Read ``3``, ``2,4`` or a label in quotation marks."""
    count = len(session.layers)
    if which is None:
        raise _refused(text, f"name a layer from 1 to {count}, or its label", path)
    if which.startswith('"'):
        found = [n for n, layer in enumerate(session.layers) if layer.label == which.strip('"')]
        if not found:
            raise _refused(text, "no layer has that label", path)
        return tuple(found)
    parts = which.split(",")
    if not all(part.isascii() and part.isdigit() and 1 <= int(part) <= count for part in parts):
        raise _refused(text, f"layers are numbered from 1 to {count}", path)
    return tuple(int(part) - 1 for part in parts)


def _entry(session: Session, table: str, member: int | str) -> Any:
    if isinstance(member, int):
        return session.layers[member]
    if table == "material":
        return next(entry for entry in session.materials if entry.name == member)
    return getattr(session, table)


def _with_entry(session: Session, table: str, member: int | str, entry: Any) -> Session:
    if isinstance(member, int):
        layers = (*session.layers[:member], entry, *session.layers[member + 1 :])
        return replace(session, layers=layers)
    if table == "material":
        others = tuple(entry if old.name == member else old for old in session.materials)
        return replace(session, materials=others)
    return replace(session, **{table: entry})


def _fraction(wanted: Parameter, formula: str | None) -> float:
    return float(_alloy(wanted, formula).group(3))


def _with_fraction(wanted: Parameter, formula: str | None, fraction: float) -> str:
    before, first, _, second, _, after = (part or "" for part in _alloy(wanted, formula).groups())
    return f"{before}{first}{_digits(fraction)}{second}{_digits(1.0 - fraction)}{after}"


def _alloy(wanted: Parameter, formula: str | None) -> re.Match[str]:
    match = _ALLOY.fullmatch(formula or "")
    if match is None:
        allowed = "a composition is that of an alloy of two fractions, as Al0.3Ga0.7As"
        raise SessionError(wanted.text, f"is that of {shown(formula)}", allowed)
    return match


def _digits(fraction: float) -> str:
    return f"{fraction:.{DIGITS}f}".rstrip("0")


def _refused(text: str, allowed: str, path: KeyPath) -> SessionError:
    return SessionError("parameter", f"is {printable(text)!r}", allowed, path=path)
