"""The tables ``[tolerance]`` and ``[[spec]]``: what growth leaves to chance, what has to hold."""

from __future__ import annotations

from typing import Any

from tui.session import tables
from tui.session.checked import refuse, table_values
from tui.session.model import SpecEntry, ToleranceEntry
from tui.session.refusal import shown


def tolerance_of(table: dict[str, Any]) -> ToleranceEntry:
    """Read ``[tolerance]``.

    Raises
    ------
    SessionError
        A key is not known, a value out of range, or both units of thickness are stated.
    """
    values = table_values(table, tables.TOLERANCE, ("tolerance",), "tolerance")
    if "thickness_nm" in values and "thickness_ml" in values:
        found = "stands beside thickness_nm"
        path = ("tolerance", "thickness_ml")
        raise refuse(path, "tolerance thickness_ml", found, "keep one of the two")
    for key in tables.WHOLE:
        if key in values:
            if values[key] != int(values[key]):
                rule = tables.TOLERANCE[key]
                allowed = "" if isinstance(rule, tables.Text) else rule.allowed
                found = f"is {shown(table[key])}"
                raise refuse(("tolerance", key), f"tolerance {key}", found, allowed)
            values[key] = int(values[key])
    return ToleranceEntry(**values)


def specs_of(value: Any) -> tuple[SpecEntry, ...]:
    """Read every ``[[spec]]``.

    Raises
    ------
    SessionError
        One without a result or without a bound, or with bounds that leave nothing between them.
    """
    if not isinstance(value, list) or not all(isinstance(item, dict) for item in value):
        raise refuse(("spec",), "spec", f"is {shown(value)}", "write each one under [[spec]]")
    return tuple(_spec(item, index) for index, item in enumerate(value))


def _spec(table: dict[str, Any], index: int) -> SpecEntry:
    path, name = ("spec", index), f"spec {index + 1}"
    values = table_values(table, tables.SPEC, path, name)
    if "result" not in values:
        allowed = 'name the result that it bounds, as result = "level 1 energy_eV"'
        raise refuse(path, name, "has no result", allowed)
    spec = SpecEntry(**values)
    if spec.at_least is None and spec.at_most is None:
        raise refuse(path, name, "has no bound", "give at_least, at_most or both")
    if spec.at_least is not None and spec.at_most is not None and spec.at_least >= spec.at_most:
        found = f"is {spec.at_most:g}, not above at_least = {spec.at_least:g}"
        raise refuse((*path, "at_most"), f"{name} at_most", found, "a range has an upper end above")
    return spec
