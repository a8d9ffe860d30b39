"""Where in a session text tables and keys stand.

A light scan of TOML's structure, line by line: table headers and keys at the start of a line. What
stands in comments and in strings over several lines is blanked first, so that it is not taken for
structure. Keys inside inline tables are found by the line of the table.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator
from functools import lru_cache

KeyPath = tuple[str | int, ...]
"""Table names, for ``[[layer]]`` the index from 0 as well, then the key."""

MOST_PARTS = 64
"""Parts of a dotted key from which a text is refused: reading takes time with their square."""

_NAME = r"""(?:[A-Za-z0-9_-]+|"(?:\\.|[^"\\\n])*"|'[^'\n]*')"""
_DOTTED = rf"{_NAME}(?:\s*\.\s*{_NAME})*"
_HEADER = re.compile(rf"^\s*(?:\[\s*({_DOTTED})\s*\]|\[\[\s*({_DOTTED})\s*\]\])\s*(?:#.*)?$")
_KEY = re.compile(rf"^\s*({_DOTTED})\s*=")
_TANGLED = re.compile(  # possessive, and from the start of a part on: time grows with the length
    r"""(?<![A-Za-z0-9_-])(?:(?:[A-Za-z0-9_-]++|"[^"\n]*+"|'[^'\n]*+')[ \t]*+\.[ \t]*+)"""
    rf"{{{MOST_PARTS}}}"
)
_HIDING = re.compile(
    r'''"""(?:\\.|(?!""")[^\\])*"{3,5}'''
    r"""|'''(?:(?!''').)*'{3,5}"""
    r'''|"(?:\\.|[^"\\\n])*"'''
    r"""|'[^'\n]*'"""
    r"""|\#[^\n]*""",
    re.DOTALL,
)


def line_of(text: str, path: KeyPath) -> int | None:
    """Line of a key or table, counted from 1; of its table where the key itself is not found."""
    places: dict[KeyPath, int] = {}
    table: KeyPath = ()
    for number, header, key in _scan(bare(text)):
        table = table if header is None else header
        place = (*table, *key)
        for length in range(1, len(place) + 1):  # a.b.c is where a begins, too
            places.setdefault(place[:length], number)
    for length in range(len(path), 0, -1):
        if path[:length] in places:
            return places[path[:length]]
    return None


def headers(bare_text: str) -> list[tuple[int, KeyPath]]:
    """Line and name of every table header of a `bare` text, in order."""
    return [(number, header) for number, header, _ in _scan(bare_text) if header is not None]


def bare(text: str) -> str:
    """Blank what hides in comments and long strings; every line keeps its number."""
    return _HIDING.sub(_blanked, text)


def tangled(text: str) -> int | None:
    """Line of a key of more than `MOST_PARTS` parts, in any text whatever."""
    found = _TANGLED.search(text)
    return None if found is None else text.count("\n", 0, found.start()) + 1


def comments(text: str) -> list[str]:
    """Collect all comments, in order."""
    found = (match[0].strip() for match in _HIDING.finditer(text))
    return [hiding for hiding in found if hiding.startswith("#")]


def _blanked(hiding: re.Match[str]) -> str:
    found = hiding[0]
    if found.startswith("#"):
        return "#"
    if found.startswith(('"""', "'''")):
        return '""' + "\n" * found.count("\n") + '""'
    return found


def _scan(bare_text: str) -> Iterator[tuple[int, KeyPath | None, KeyPath]]:
    """Yield line, table name (at a header) and key (at a key)."""
    counts: dict[KeyPath, int] = {}
    for number, line in enumerate(bare_text.split("\n"), start=1):
        header, key = _HEADER.match(line), _KEY.match(line)
        if header:
            yield number, _numbered(header, counts), ()
        elif key:
            yield number, None, _parts(key[1])


def _numbered(header: re.Match[str], counts: dict[KeyPath, int]) -> KeyPath:
    """Name of a table; one of an array of tables has its index at the end."""
    if header[1]:
        return _parts(header[1])
    name = _parts(header[2])
    counts[name] = counts.get(name, -1) + 1
    return (*name, counts[name])


@lru_cache(maxsize=1024)
def _parts(dotted: str) -> KeyPath:
    here: object = tomllib.loads(f"{dotted} = 0")
    parts: list[str] = []
    while isinstance(here, dict):
        [(part, here)] = here.items()
        parts.append(part)
    return tuple(parts)
