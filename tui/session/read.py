"""From text to `Session`: strict, and clear about what it refuses.

Reading is by tomllib. Where something is refused, the line is looked up afterwards (`lines`), so
that good texts are read at full speed.
"""

from __future__ import annotations

import difflib
import math
import re
import tomllib
from pathlib import Path
from typing import Any

from tui.session import tables
from tui.session.lines import MOST_PARTS, KeyPath, tangled
from tui.session.model import (
    Conditions,
    ContactEntry,
    LayerEntry,
    MaterialEntry,
    Session,
    View,
)
from tui.session.refusal import SessionError, has_controls, named, printable, shown
from tui.session.tables import Table, Text

FORMAT = 1
REMEDY = "name a session text, or send it to standard input and give - for its name"
MAX_BYTES = 2_000_000
"""A design of 10,000 layers is 1 MB; what is larger is no session text."""


def load(path: Path) -> tuple[str, Session]:
    """Read a session file.

    Returns
    -------
    text : str
        The file as it stands.
    session : Session
        What it says.

    Raises
    ------
    SessionError
        The file cannot be read, or what it says is refused.
    """
    source = str(path)
    try:
        objection = _objection(path)
        data = b"" if objection else path.read_bytes()
    except (OSError, ValueError) as error:  # ValueError: a NUL in the name
        reason = getattr(error, "strerror", None) or str(error)
        raise SessionError("", "it cannot be read", reason.lower(), source=source) from error
    if objection:
        raise SessionError("", objection, REMEDY, source=source)
    text = decode(data, source)
    return text, read_session(text, source)


def _objection(path: Path) -> str:
    """Say why a file is not worth reading."""
    if path.is_dir():
        return "it is a folder"
    if path.exists() and not path.is_file():  # a pipe would wait for its writer
        return "it is no regular file"
    return f"it is larger than {MAX_BYTES} bytes" if path.stat().st_size > MAX_BYTES else ""


def decode(data: bytes, source: str) -> str:
    """Decode a session text.

    Raises
    ------
    SessionError
        Too large, or no UTF-8.
    """
    if len(data) > MAX_BYTES:
        found = f"it is larger than {MAX_BYTES} bytes"
        raise SessionError("", found, "no session text is", source=source)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        found = "it is no UTF-8 text"
        raise SessionError("", found, "save it as UTF-8", source=source, line=line) from error
    if "\0" in text:
        raise SessionError("", "it holds NUL characters", "it is no text file", source=source)
    return text


def read_session(text: str, source: str) -> Session:
    """Read a session text.

    Parameters
    ----------
    text : str
        TOML 1.0.
    source : str
        The name that refusals give to it.

    Raises
    ------
    SessionError
        With the line and the key where they are known.
    """
    line = tangled(text)
    if line is not None:
        found = f"a key has more than {MOST_PARTS} parts"
        raise SessionError("", found, "no key of a session text has", source=source, line=line)
    try:
        document = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise _syntax(str(error), source) from error
    except RecursionError as error:
        raise SessionError("", "it is nested too deep", "flatten it", source=source) from error
    except ValueError as error:  # a date or an integer that Python cannot hold
        found = f"a value cannot be read ({printable(str(error))})"
        raise SessionError("", found, "correct it", source=source) from error
    try:
        return _session(document)
    except SessionError as error:
        raise error.located(text, source) from None


def _syntax(message: str, source: str) -> SessionError:
    place = re.search(r"\(at line (\d+), column (\d+)\)", message)
    said = printable(message.split(" (at ", maxsplit=1)[0])
    remedy = f"correct it at column {place[2]}" if place else "the text ends too early"
    return SessionError(
        "", f"it is no TOML: {said}", remedy, source=source, line=int(place[1]) if place else None
    )


def _session(document: dict[str, Any]) -> Session:
    _require_known(document, tables.TOP_KEYS, (), "")
    _require_format(document)
    texts = _values(
        {key: value for key, value in document.items() if key in tables.TOP_TEXTS},
        tables.TOP_TEXTS,
        (),
        "",
    )
    for name in ("left", "right", "layer"):
        if name not in document:
            header = "[[layer]]" if name == "layer" else f"[{name}]"
            raise _refuse((), header, "is missing", "a stack has two contacts and layers")
    layers = _layers(document["layer"])
    return Session(
        title=str(texts.get("title", "")),
        notes=str(texts.get("notes", "")),
        conditions=_conditions(_table(document, "conditions")),
        left=_contact(_table(document, "left"), "left"),
        layers=layers,
        right=_contact(_table(document, "right"), "right"),
        materials=_materials(_table(document, "material")),
        view=_view(_table(document, "view")),
    )


def _require_format(document: dict[str, Any]) -> None:
    if "format" not in document:
        raise _refuse((), "format", "is missing", f"write format = {FORMAT} at the top")
    value = document["format"]
    if type(value) is not int or value != FORMAT:
        raise _refuse(("format",), "format", f"is {shown(value)}", f"this version reads {FORMAT}")


def _table(document: dict[str, Any], name: str) -> dict[str, Any]:
    value = document.get(name, {})
    if not isinstance(value, dict):
        raise _refuse((name,), name, f"is {shown(value)}", f"a table [{name}] is expected")
    return value


def _conditions(table: dict[str, Any]) -> Conditions:
    values = _values(table, tables.CONDITIONS, ("conditions",), "conditions")
    for key, models, rule in (
        ("field", tables.FIELD_MODELS, tables.FIELD_RULE),
        ("charge", tables.CHARGE_MODELS, tables.CHARGE_RULE),
    ):
        if values.get(key, models[0]) not in models:
            found = f"is {shown(values[key])}"
            raise _refuse(("conditions", key), f"conditions {key}", found, rule)
    return Conditions(**values)


def _contact(table: dict[str, Any], name: str) -> ContactEntry:
    entry = ContactEntry(**_values(table, tables.CONTACT, (name,), name))
    _require_medium(table, (name,), name)
    return entry


def _layers(value: Any) -> tuple[LayerEntry, ...]:
    if not isinstance(value, list) or not all(isinstance(item, dict) for item in value):
        raise _refuse(("layer",), "layer", f"is {shown(value)}", "write each layer under [[layer]]")
    if not value:
        raise _refuse(("layer",), "layer", "is an empty list", "a stack has at least one layer")
    return tuple(_layer(item, index) for index, item in enumerate(value))


def _layer(table: dict[str, Any], index: int) -> LayerEntry:
    path, name = ("layer", index), f"layer {index + 1}"
    entry = LayerEntry(**_values(table, tables.LAYER, path, name))
    _require_medium(table, path, name)
    if entry.thickness_nm is None and entry.thickness_ml is None:
        raise _refuse(path, name, "has no thickness", "give thickness_nm or thickness_ml")
    return entry


def _require_medium(table: dict[str, Any], path: KeyPath, name: str) -> None:
    """Ask for a material, or an edge with a mass."""
    if "material" in table or ("edge_eV" in table and "mass" in table):
        return
    missing = "mass" if "edge_eV" in table else "edge_eV" if "mass" in table else ""
    found = f"has no {missing}" if missing else "has no material"
    raise _refuse(path, name, found, "give a material, or edge_eV with mass")


def _materials(table: dict[str, Any]) -> tuple[MaterialEntry, ...]:
    return tuple(_material(table, name) for name in table)


def _material(table: dict[str, Any], name: str) -> MaterialEntry:
    path = ("material", name)
    key = f"material {named(name)}"
    if not name or has_controls(name):
        raise _refuse(path, key, "has no usable name", tables.NAME_RULE)
    if not isinstance(table[name], dict):
        allowed = f"a table [material.{named(name)}] is expected"
        raise _refuse(path, key, f"is {shown(table[name])}", allowed)
    values = _values(table[name], tables.MATERIAL, path, key)
    for needed in ("edge_eV", "mass"):
        if needed not in values:
            raise _refuse(
                path, key, f"has no {needed}", "a material of one's own has edge_eV and mass"
            )
    return MaterialEntry(name=name, **values)


def _view(table: dict[str, Any]) -> View:
    view = View(**_values(table, tables.VIEW, ("view",), "view"))
    if view.from_eV is not None and view.to_eV is not None and not view.from_eV < view.to_eV:
        found = f"is {view.to_eV:g}, not above from_eV = {view.from_eV:g}"
        raise _refuse(("view", "to_eV"), "view to_eV", found, "a window has from_eV below to_eV")
    return view


def _values(table: dict[str, Any], keys: Table, path: KeyPath, name: str) -> dict[str, Any]:
    """Check every value of one table."""
    _require_known(table, tuple(keys), path, name)
    return {
        key: _value(table[key], keys[key], (*path, key), f"{name} {key}".strip()) for key in table
    }


def _require_known(table: dict[str, Any], keys: tuple[str, ...], path: KeyPath, name: str) -> None:
    for key in table:
        if key in keys:
            continue
        said = f"{name} {named(key)}".strip()
        meant = tables.UNITLESS.get(key)
        if meant is not None and any(part in keys for part in meant.split(" or ")):
            raise _refuse((*path, key), said, "has no unit", f"write {meant}")
        close = difflib.get_close_matches(key, keys, n=1, cutoff=0.6)
        allowed = f"did you mean {close[0]}?" if close else f"known are {', '.join(keys)}"
        raise _refuse((*path, key), said, "is not known", allowed)


def _value(value: Any, entry: tables.Entry, path: KeyPath, name: str) -> float | str:
    if isinstance(entry, Text):
        rule = tables.TEXT_RULE if entry.lines else tables.NAME_RULE
        if not isinstance(value, str) or has_controls(value, lines=entry.lines):
            raise _refuse(path, name, f"is {shown(value)}", f"it is {rule}")
        return value
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        raise _refuse(path, name, f"is {shown(value)}", f"a number is expected: {entry.allowed}")
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    if not entry.holds(number):
        raise _refuse(path, name, f"is {shown(value)}", entry.allowed)
    return number


def _refuse(path: KeyPath, key: str, found: str, allowed: str) -> SessionError:
    return SessionError(key, found, allowed, path=path)
