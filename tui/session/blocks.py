"""A session text cut into blocks, one a table, so that each keeps its own comments.

A block begins with the comment lines that stand directly above its header. Joined again, the blocks
are the text. Only where a table was changed is its block rewritten, by tomlkit, which keeps every
comment, every key's place and the spelling of all other values.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import tomlkit
from tomlkit.items import AoT, Comment, Trivia

from tui.session.lines import KeyPath, bare, headers

Values = Mapping[str, float | int | str | None]


@dataclass(frozen=True)
class Block:
    """One table's text; ``name`` is empty for the keys before the first header."""

    name: KeyPath
    text: str
    fresh: bool = False
    """Whether it was not in the text before, and wants a blank line above."""


def split(text: str) -> list[Block]:
    """Cut a text before the comments of every header."""
    lines = text.split("\n")
    lines = [line + "\n" for line in lines[:-1]] + [lines[-1]]
    structure = bare(text)
    is_comment = [line.lstrip().startswith("#") for line in structure.split("\n")]
    cuts: list[int] = [0]
    names: list[KeyPath] = [()]
    for number, name in headers(structure):
        start = number - 1
        while start > cuts[-1] and is_comment[start - 1]:
            start -= 1
        cuts.append(start)
        names.append(name)
    ends = [*cuts[1:], len(lines)]
    return [
        Block(name, "".join(lines[start:end]))
        for name, start, end in zip(names, cuts, ends, strict=True)
    ]


def join(blocks: list[Block]) -> str:
    """Put blocks together."""
    text, after_fresh = "", False
    for block in blocks:
        if text and not text.endswith("\n"):
            text += "\n"
        if (block.fresh or after_fresh) and text and not text.endswith("\n\n"):
            text += "\n"
        text += block.text
        after_fresh = block.fresh
    return text


def difference(before: Values, after: Values) -> Values:
    """Give the values that changed; None for a key that goes."""
    return {key: value for key, value in after.items() if before.get(key) != value}


def changed(block: Block, before: Values, after: Values) -> Block:
    """Rewrite a block so that it says other values; equal ones are not touched.

    ``None`` stands for a key that is not there. The comment of a key that goes is kept: it moves to
    the first key that comes, or to a line of its own.
    """
    values = difference(before, after)
    if not values:
        return block
    body = block.text.rstrip("\n")
    tail = block.text[len(body) :] or "\n"
    document = tomlkit.parse(body + "\n")
    _change(_table(document, block.name), values)
    return Block(block.name, tomlkit.dumps(document).rstrip("\n") + tail, block.fresh)


def changed_in_place(text: str, changes: Mapping[KeyPath, Values]) -> str:
    """Rewrite a text whose tables are no blocks: dotted keys, inline tables, a list of layers."""
    document = tomlkit.parse(text)
    for name, values in changes.items():
        here: Any = document
        for part in name:
            here = here[part]
        _change(here, values)
    return tomlkit.dumps(document)


def _change(table: Any, values: Values) -> None:
    comments: list[str] = []
    for key, value in values.items():
        if value is None and key in table:
            comments += [table[key].trivia.comment] if table[key].trivia.comment else []
            del table[key]
    for key, value in values.items():
        if value is None:
            continue
        is_new = key not in table
        table[key] = value
        if is_new and comments:
            table[key].trivia.comment_ws, table[key].trivia.comment = "  ", comments.pop(0)
    for comment in comments:
        table.add(Comment(Trivia(comment=comment)))


def _table(document: Any, name: KeyPath) -> Any:
    here = document
    for part in name:
        if isinstance(part, str):
            here = here[part]
            here = here[0] if isinstance(here, AoT) else here
    return here
