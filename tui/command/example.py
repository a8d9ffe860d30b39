"""``winze example``: the embedded demo design, as a text to start from."""

from __future__ import annotations

from argparse import Namespace, _SubParsersAction
from typing import Any

from tui.command import options as shared
from tui.diagnostics import DONE
from tui.session.demo import demo_text


def add(commands: _SubParsersAction[Any]) -> None:
    """Add the command."""
    parser = commands.add_parser(
        "example",
        help="the demo design's session text",
        description="Write the session text of the demo design, to start one's own from.",
    )
    parser.add_argument("-o", dest="output", metavar="PATH", help="write to a file")
    parser.set_defaults(run=run)


def run(options: Namespace) -> int:
    """Answer."""
    shared.put(options, demo_text())
    return DONE
