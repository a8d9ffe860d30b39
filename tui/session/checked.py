"""The values of one table of a session text, held to the list of what may stand there."""

from __future__ import annotations

import difflib
import math
from typing import Any

from tui.session import tables
from tui.session.lines import KeyPath
from tui.session.refusal import SessionError, has_controls, named, shown
from tui.session.tables import Table, Text


def table_values(table: dict[str, Any], keys: Table, path: KeyPath, name: str) -> dict[str, Any]:
    """Check every value of one table."""
    require_known(table, tuple(keys), path, name)
    return {
        key: _value(table[key], keys[key], (*path, key), f"{name} {key}".strip()) for key in table
    }


def require_known(table: dict[str, Any], keys: tuple[str, ...], path: KeyPath, name: str) -> None:
    """Refuse a key that is not known, and guess what was meant."""
    for key in table:
        if key in keys:
            continue
        said = f"{name} {named(key)}".strip()
        meant = tables.UNITLESS.get(key)
        if meant is not None and any(part in keys for part in meant.split(" or ")):
            raise refuse((*path, key), said, "has no unit", f"write {meant}")
        close = difflib.get_close_matches(key, keys, n=1, cutoff=0.6)
        allowed = f"did you mean {close[0]}?" if close else f"known are {', '.join(keys)}"
        raise refuse((*path, key), said, "is not known", allowed)


def _value(value: Any, entry: tables.Entry, path: KeyPath, name: str) -> float | str:
    if isinstance(entry, Text):
        rule = tables.TEXT_RULE if entry.lines else tables.NAME_RULE
        if not isinstance(value, str) or has_controls(value, lines=entry.lines):
            raise refuse(path, name, f"is {shown(value)}", f"it is {rule}")
        return value
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        raise refuse(path, name, f"is {shown(value)}", f"a number is expected: {entry.allowed}")
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    if not entry.holds(number):
        raise refuse(path, name, f"is {shown(value)}", entry.allowed)
    return number


def refuse(path: KeyPath, key: str, found: str, allowed: str) -> SessionError:
    """Make the refusal of what stands at a path."""
    return SessionError(key, found, allowed, path=path)
