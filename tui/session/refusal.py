"""What is said when a session text or a file is refused."""

from __future__ import annotations

import math
import unicodedata

from tui.session.lines import KeyPath, line_of

LONGEST_SHOWN = 60


class SessionError(Exception):
    """A session text that is refused, or a file that cannot be read or written.

    Parameters
    ----------
    key : str
        What is at fault, as in ``"layer 3 thickness_nm"``; empty where it is the whole file.
    found : str
        What was found there.
    allowed : str
        What would be accepted, or what to do.
    source : str
        The file's name; empty where it is not known yet.
    line : int, optional
        Line in the file, counted from 1.
    path : tuple
        Where in the tables it stands, by which the line is found later.
    """

    def __init__(
        self,
        key: str,
        found: str,
        allowed: str,
        *,
        source: str = "",
        line: int | None = None,
        path: KeyPath = (),
    ) -> None:
        self.key = key
        self.found = found
        self.allowed = allowed
        self.source = source
        self.line = line
        self.path = path
        super().__init__(str(self))

    def __str__(self) -> str:
        place = printable(self.source)
        if self.line is not None:
            place = f"{place}, line {self.line}" if place else f"line {self.line}"
        said = " ".join(part for part in (self.key, self.found) if part)
        return ": ".join(part for part in (place, f"{said}; {self.allowed}") if part)

    def located(self, text: str, source: str) -> SessionError:
        """Give the same refusal with its place in a text."""
        line = line_of(text, self.path) if self.line is None and self.path else self.line
        return SessionError(
            self.key, self.found, self.allowed, source=source, line=line, path=self.path
        )


def printable(text: str) -> str:
    """Escape what a terminal would act upon; leave every other character alone."""
    return "".join(
        character if unicodedata.category(character)[0] != "C" else _escaped(character)
        for character in text
    )


def has_controls(text: str, *, lines: bool = False) -> bool:
    """Whether a text holds control characters, line ends and tabs apart where ``lines``."""
    kept = "\n\t" if lines else ""
    return any(unicodedata.category(c)[0] == "C" and c not in kept for c in text)


def shown(value: object) -> str:
    """Quote a value: short, on one line, without control characters."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, (dict, list)):  # its contents may be long, and nested without end
        return "a table" if isinstance(value, dict) else "a list"
    if isinstance(value, float) and not math.isfinite(value):
        return "not a number" if math.isnan(value) else "infinite"
    try:
        text = printable(repr(value) if isinstance(value, str) else str(value))
    except ValueError:  # Python writes no whole number of thousands of digits
        return "too long to be shown"
    return _short(text)


def named(key: str) -> str:
    """Name a key or a table: short and printable; one without characters by its quotation marks."""
    return _short(printable(key)) or '""'


def _short(text: str) -> str:
    return text if len(text) <= LONGEST_SHOWN else text[: LONGEST_SHOWN - 3] + "..."


def _escaped(character: str) -> str:
    code = ord(character)
    return f"\\x{code:02x}" if code < 0x100 else f"\\u{code:04x}"
