"""How roles look, and what the terminal can show and take.

Nothing is said by colour alone. The palette is Okabe and Ito's (Color Universal Design, 2008; from
memory), in its middle tones, which read on dark and on light backgrounds and which a colour-blind
eye tells apart. All else is in the terminal's own colours.
"""

from __future__ import annotations

import os
import select
import sys
from collections.abc import Mapping

from rich.style import Style

from tui.figures.cells import PLAIN, RICH, Glyphs

STYLES: dict[str, Style] = {
    "": Style(),
    "axis": Style(dim=True),
    "edge": Style(bold=True),
    "density": Style(color="#3a96dd"),
    "fill": Style(color="#3a96dd", dim=True),
    "level": Style(color="#e69f00", bold=True),
    "curve": Style(color="#009e73", bold=True),
    "fermi": Style(bold=True, underline=True),
    "line": Style(color="#d55e00"),
    "pointer": Style(color="#d55e00", reverse=True),
    "feature": Style(bold=True, underline=True),
    "share": Style(color="#e69f00"),
    "overlay 1": Style(color="#56b4e9"),
    "overlay 2": Style(color="#cc79a7"),
    "overlay 3": Style(color="#e69f00"),
    "overlay 4": Style(color="#3a96dd"),
    "head": Style(dim=True, underline=True),
    "faint": Style(dim=True),
    "strong": Style(bold=True),
    "here": Style(bold=True),
    "cursor": Style(reverse=True, bold=True),
    "bar": Style(reverse=True),
    "trouble": Style(color="#d55e00", bold=True),
}


def glyphs_for_terminal() -> Glyphs:
    """Choose characters that the terminal can show."""
    encoding = (getattr(sys.__stdout__, "encoding", "") or "").lower().replace("-", "")
    if encoding != "utf8" or os.environ.get("TERM", "") == "linux":
        return PLAIN
    return RICH if _locale_is_utf8(os.environ) else PLAIN


def takes_more() -> bool:
    """Whether the terminal has taken what was sent: on a slow link it falls behind."""
    screen = sys.__stderr__  # Textual writes there
    if os.name != "posix" or screen is None or screen.closed:
        return True
    return bool(select.select([], [screen.fileno()], [], 0.0)[1])


def _locale_is_utf8(environment: Mapping[str, str]) -> bool:
    """Whether the user's locale says UTF-8; Python itself writes UTF-8 even where it does not.

    In the C locale Python sets LC_CTYPE=C.UTF-8 for itself, which tells nothing of the terminal.
    """
    language = environment.get("LANG", "")
    ctype = environment.get("LC_CTYPE", "")
    if ctype == "C.UTF-8" and language in ("", "C", "POSIX"):
        ctype = ""
    named = environment.get("LC_ALL", "") or ctype or language
    return named.lower().replace("-", "").endswith("utf8")
