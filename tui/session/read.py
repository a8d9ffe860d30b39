"""From text to `Session`: strict, and clear about what it refuses.

Reading is by tomllib. Where something is refused, the line is looked up afterwards (`lines`), so
that good texts are read at full speed.
"""

from __future__ import annotations

import re
import tomllib
from pathlib import Path
from typing import Any

from physics.ranges import TEMPERATURE_K
from tui.session import tables
from tui.session.allowances import specs_of, tolerance_of
from tui.session.checked import refuse, require_known, table_values
from tui.session.lines import MOST_PARTS, KeyPath, tangled
from tui.session.model import (
    Conditions,
    ContactEntry,
    DeviceEntry,
    Growth,
    LayerEntry,
    MaterialEntry,
    Session,
    SweepEntry,
    View,
)
from tui.session.refusal import SessionError, has_controls, named, printable, shown

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
    require_known(document, tables.TOP_KEYS, (), "")
    _require_format(document)
    texts = table_values(
        {key: value for key, value in document.items() if key in tables.TOP_TEXTS},
        tables.TOP_TEXTS,
        (),
        "",
    )
    for name in ("left", "right", "layer"):
        if name not in document:
            header = "[[layer]]" if name == "layer" else f"[{name}]"
            raise refuse((), header, "is missing", "a stack has two contacts and layers")
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
        sweep=_sweep(_table(document, "sweep")),
        device=DeviceEntry(
            **table_values(_table(document, "device"), tables.DEVICE, ("device",), "device")
        ),
        growth=Growth(
            **table_values(_table(document, "growth"), tables.GROWTH, ("growth",), "growth")
        ),
        tolerance=tolerance_of(_table(document, "tolerance")),
        specs=specs_of(document.get("spec", [])),
    )


def _require_format(document: dict[str, Any]) -> None:
    if "format" not in document:
        raise refuse((), "format", "is missing", f"write format = {FORMAT} at the top")
    value = document["format"]
    if type(value) is not int or value != FORMAT:
        raise refuse(("format",), "format", f"is {shown(value)}", f"this version reads {FORMAT}")


def _table(document: dict[str, Any], name: str) -> dict[str, Any]:
    value = document.get(name, {})
    if not isinstance(value, dict):
        raise refuse((name,), name, f"is {shown(value)}", f"a table [{name}] is expected")
    return value


def _conditions(table: dict[str, Any]) -> Conditions:
    values = table_values(table, tables.CONDITIONS, ("conditions",), "conditions")
    for key, models, rule in (
        ("field", tables.FIELD_MODELS, tables.FIELD_RULE),
        ("charge", tables.CHARGE_MODELS, tables.CHARGE_RULE),
        ("band", tables.BANDS, tables.BAND_RULE),
    ):
        if values.get(key, models[0]) not in models:
            found = f"is {shown(values[key])}"
            raise refuse(("conditions", key), f"conditions {key}", found, rule)
    return Conditions(**values)


def _contact(table: dict[str, Any], name: str) -> ContactEntry:
    entry = ContactEntry(**table_values(table, tables.CONTACT, (name,), name))
    _require_medium(table, (name,), name)
    return entry


def _layers(value: Any) -> tuple[LayerEntry, ...]:
    if not isinstance(value, list) or not all(isinstance(item, dict) for item in value):
        raise refuse(("layer",), "layer", f"is {shown(value)}", "write each layer under [[layer]]")
    if not value:
        raise refuse(("layer",), "layer", "is an empty list", "a stack has at least one layer")
    return tuple(_layer(item, index) for index, item in enumerate(value))


def _layer(table: dict[str, Any], index: int) -> LayerEntry:
    path, name = ("layer", index), f"layer {index + 1}"
    entry = LayerEntry(**table_values(table, tables.LAYER, path, name))
    _require_medium(table, path, name)
    if entry.thickness_nm is None and entry.thickness_ml is None:
        raise refuse(path, name, "has no thickness", "give thickness_nm or thickness_ml")
    return entry


def _require_medium(table: dict[str, Any], path: KeyPath, name: str) -> None:
    """Ask for a material, or an edge with a mass."""
    if "material" in table or ("edge_eV" in table and "mass" in table):
        return
    missing = "mass" if "edge_eV" in table else "edge_eV" if "mass" in table else ""
    found = f"has no {missing}" if missing else "has no material"
    raise refuse(path, name, found, "give a material, or edge_eV with mass")


def _materials(table: dict[str, Any]) -> tuple[MaterialEntry, ...]:
    return tuple(_material(table, name) for name in table)


def _material(table: dict[str, Any], name: str) -> MaterialEntry:
    path = ("material", name)
    key = f"material {named(name)}"
    if not name or has_controls(name):
        raise refuse(path, key, "has no usable name", tables.NAME_RULE)
    if not isinstance(table[name], dict):
        allowed = f"a table [material.{named(name)}] is expected"
        raise refuse(path, key, f"is {shown(table[name])}", allowed)
    values = table_values(table[name], tables.MATERIAL, path, key)
    for needed in ("edge_eV", "mass"):
        if needed not in values:
            raise refuse(
                path, key, f"has no {needed}", "a material of one's own has edge_eV and mass"
            )
    return MaterialEntry(name=name, **values)


def _view(table: dict[str, Any]) -> View:
    view = View(**table_values(table, tables.VIEW, ("view",), "view"))
    if view.from_eV is not None and view.to_eV is not None and not view.from_eV < view.to_eV:
        found = f"is {view.to_eV:g}, not above from_eV = {view.from_eV:g}"
        raise refuse(("view", "to_eV"), "view to_eV", found, "a window has from_eV below to_eV")
    return view


def _sweep(table: dict[str, Any]) -> SweepEntry:
    sweep = SweepEntry(**table_values(table, tables.SWEEP, ("sweep",), "sweep"))
    if sweep.from_V is not None and sweep.to_V is not None and not sweep.from_V < sweep.to_V:
        found = f"is {sweep.to_V:g}, not above from_V = {sweep.from_V:g}"
        raise refuse(("sweep", "to_V"), "sweep to_V", found, "a sweep has from_V below to_V")
    if overlay_temperatures(sweep.overlay_K) is None:
        found = f"is {shown(sweep.overlay_K)}"
        allowed = f'write it as "77 4.2"; {TEMPERATURE_K.allowed}'
        raise refuse(("sweep", "overlay_K"), "sweep overlay_K", found, allowed)
    return sweep


def _device(table: dict[str, Any]) -> DeviceEntry:
    return DeviceEntry(**table_values(table, tables.DEVICE, ("device",), "device"))


def overlay_temperatures(text: str) -> tuple[float, ...] | None:
    """Read temperatures with blanks between; None where one is none."""
    try:
        values = tuple(float(part) for part in text.split())
    except ValueError:
        return None
    return values if all(TEMPERATURE_K.holds(value) for value in values) else None
