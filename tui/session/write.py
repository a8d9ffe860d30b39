"""From `Session` back to text.

Where the user's own text is known, its comments, the order of its keys and the spelling of every
value that did not change survive (`blocks`).
"""

from __future__ import annotations

import tomllib
from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from tui.session import tables
from tui.session.lines import KeyPath, comments
from tui.session.model import LayerEntry, Session
from tui.session.origin import sources
from tui.session.read import FORMAT, read_session
from tui.session.refusal import SessionError

if TYPE_CHECKING:
    from tui.session.blocks import Block

Values = dict[str, Any]
UNSAID: Values = {
    "band": "parabolic",
    "charge": "semi-classical",
    "donors_cm3": 0.0,
    **dict.fromkeys(("label", "title", "notes", "overlay_K"), ""),
}
"""Values that a fresh text leaves out."""


def write_session(session: Session, original_text: str | None = None) -> str:
    """Write a session as text.

    Parameters
    ----------
    session : Session
        What the text is to say.
    original_text : str, optional
        The text it came from; kept but for what changed.

    Returns
    -------
    str
        A text that `read_session` reads back to the same session.

    Raises
    ------
    SessionError
        The session holds what no session text may say.
    """
    if original_text is not None:
        return _kept(session, original_text)
    text = _fresh(session)
    if read_session(text, "the text to be saved") != session:
        raise SessionError("", "the session cannot be said in a session text", "undo the last edit")
    return text


def _kept(session: Session, original: str) -> str:
    """Say a session in its original text, as much of it as can be kept."""
    from tomlkit.exceptions import TOMLKitError

    is_windows = original.count("\r\n") == original.count("\n")
    unix = original.replace("\r\n", "\n") if is_windows else original
    text = ""
    for way in (_rewritten, _changed_in_place):
        try:
            text = way(session, unix)
        except TOMLKitError:  # it reads a few good texts differently from tomllib
            continue
        if _says(text, session):
            break
    else:  # layers come, go or move in a list of inline tables: say it all afresh
        text = "".join(f"{line}\n" for line in comments(unix)) + write_session(session)
    return text.replace("\n", "\r\n") if is_windows else text


def _says(text: str, session: Session) -> bool:
    try:
        return read_session(text, "") == session
    except SessionError:
        return False


def _rewritten(session: Session, original: str) -> str:
    """Change the original's blocks where they say something else."""
    from tui.session import blocks

    before = read_session(original, "the original text")
    pieces = blocks.split(original)
    old, new = _tables(before), _tables(session)
    layer_pieces = [piece for piece in pieces if piece.name[:1] == ("layer",)]
    if len(layer_pieces) != len(before.layers):
        return original
    layers = _layer_blocks(layer_pieces, before, session)
    result: list[Block] = []
    for piece in pieces:
        if piece.name[:1] == ("layer",):  # one a place, at the last place all that are left
            count = 1 if piece is not layer_pieces[-1] else len(layers)
            result += layers[:count]
            layers = layers[count:]
        elif piece.name not in old or piece.name in new:
            result.append(blocks.changed(piece, old.get(piece.name, {}), new.get(piece.name, {})))
    written = {piece.name for piece in pieces}
    result += [
        blocks.Block(name, _table_text(name, values), fresh=True)
        for name, values in new.items()
        if name not in written and values != old.get(name)
    ]
    return blocks.join(result)


def _layer_blocks(pieces: list[Block], before: Session, session: Session) -> list[Block]:
    """Write each layer in the block of the one it came from, or in a fresh one."""
    from tui.session import blocks

    came_from = sources(before.layers, session.layers)
    return [
        blocks.changed(pieces[source], _layer(before.layers[source]), _layer(layer))
        if source is not None
        else blocks.Block(("layer",), _table_text(("layer",), _layer(layer)), fresh=True)
        for layer, source in zip(session.layers, came_from, strict=True)
    ]


def _changed_in_place(session: Session, original: str) -> str:
    """Change values where they stand; tables that come are put at the end."""
    from tui.session import blocks

    before = read_session(original, "the original text")
    old, new = _tables(before), _tables(session)
    for at, (was, now) in enumerate(zip(before.layers, session.layers, strict=False)):
        old["layer", at], new["layer", at] = _layer(was), _layer(now)
    there = tomllib.loads(original)
    changes: dict[KeyPath, blocks.Values] = {}
    fresh = []
    for name, values in new.items():
        change = blocks.difference(old.get(name, {}), values)
        if change and name in old and (not name or name[0] in there):
            changes[name] = change
        elif change:
            fresh.append(_table_text(name, values))
    return "\n".join([blocks.changed_in_place(original, changes), *fresh])


def _tables(session: Session) -> dict[KeyPath, Values]:
    """Every table but the layers', by name; a key that is not there has None."""
    result: dict[KeyPath, Values] = {
        (): {"format": FORMAT, "title": session.title, "notes": session.notes},
        ("conditions",): asdict(session.conditions),
        ("growth",): asdict(session.growth),
        ("left",): asdict(session.left),
        ("right",): asdict(session.right),
    }
    for entry in session.materials:
        values = asdict(entry)
        result["material", values.pop("name")] = values
    for name in ("view", "sweep", "device", "tolerance"):
        result[name,] = asdict(getattr(session, name))
    for number, spec in enumerate(session.specs):
        result["spec", number] = asdict(spec)
    return result


def _layer(entry: LayerEntry) -> Values:
    return {key: getattr(entry, key) for key in tables.LAYER}


def _fresh(session: Session) -> str:
    """Write the text of a session without an original, in the order of the keys' list."""
    parts = _tables(session)
    text = f"format = {FORMAT}\n"
    for key in ("title", "notes"):
        if parts[()][key]:
            text += f"{key} = {_said(parts[()][key])}\n"
    pieces = [_table_text(("conditions",), parts["conditions",])]
    if session.growth != type(session.growth)():
        pieces.append(_table_text(("growth",), parts["growth",]))
    pieces.append(_table_text(("left",), parts["left",]))
    pieces += [_table_text(("layer",), _layer(layer)) for layer in session.layers]
    pieces.append(_table_text(("right",), parts["right",]))
    pieces += [_table_text(name, parts[name]) for name in parts if name[:1] == ("material",)]
    for name in ("view", "sweep", "device", "tolerance"):
        table = getattr(session, name)
        if table != type(table)():
            pieces.append(_table_text((name,), parts[name,]))
    pieces += [_table_text(name, parts[name]) for name in parts if name[:1] == ("spec",)]
    return "\n".join([text, *pieces])


def _table_text(name: KeyPath, values: Values) -> str:
    header = ".".join(_name(part) for part in name if isinstance(part, str))
    is_one_of_many = name == ("layer",) or isinstance(name[-1], int)
    lines = [f"[[{header}]]" if is_one_of_many else f"[{header}]"]
    lines += [
        f"{key} = {_said(value)}"
        for key, value in values.items()
        if value is not None and value != UNSAID.get(key)
    ]
    return "\n".join(lines) + "\n"


def _said(value: float | int | str) -> str:
    if isinstance(value, str):
        return _quoted(value)
    return repr(value)


def _quoted(text: str) -> str:
    escaped = text.replace("\\", "\\\\").replace('"', '\\"').replace("\t", "\\t")
    return f'"""\n{escaped}"""' if "\n" in text else f'"{escaped}"'


def _name(part: str) -> str:
    bare = part and all(c.isascii() and (c.isalnum() or c in "_-") for c in part)
    return part if bare else _quoted(part)
