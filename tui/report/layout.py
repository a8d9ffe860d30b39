"""Tables in columns, for a reader."""

from __future__ import annotations

from collections.abc import Sequence
from unicodedata import combining, east_asian_width


def columns(head: Sequence[str], rows: list[list[str]], left_aligned: tuple[int, ...]) -> str:
    """Lay out a table in columns two blanks apart; numbers end in line."""
    every = [list(head), *rows]
    widths = [max(_cells(row[n]) for row in every) for n in range(len(head))]
    used = [n for n, width in enumerate(widths) if any(row[n] for row in rows) or n == 0]
    lines = []
    for row in every:
        cells = [_padded(row[n], widths[n], left=n in left_aligned) for n in used]
        lines.append("  ".join(cells).rstrip() + "\n")
    return "".join(lines)


def _padded(text: str, width: int, *, left: bool) -> str:
    blanks = " " * (width - _cells(text))
    return text + blanks if left else blanks + text


def _cells(text: str) -> int:
    """Count the terminal's cells: a label may be in a script with wide signs, or with accents."""
    if text.isascii():
        return len(text)
    wide = sum(east_asian_width(sign) in {"W", "F"} for sign in text)
    return len(text) + wide - sum(bool(combining(sign)) for sign in text)
