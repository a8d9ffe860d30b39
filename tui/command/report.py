"""``winze report``: the whole answer for a reader."""

from __future__ import annotations

from argparse import Namespace, _SubParsersAction
from typing import Any

from tui.command import options as shared
from tui.report.objects import report_object
from tui.report.text import report_text
from tui.study import solve


def add(commands: _SubParsersAction[Any]) -> None:
    """Add the command."""
    parser = commands.add_parser(
        "report",
        help="the whole answer, as text to read",
        description="Stack, levels, transmission and notes in one text.",
    )
    shared.add_common(parser)
    shared.add_window(parser, max_width=True)
    parser.set_defaults(run=run)


def run(options: Namespace) -> int:
    """Answer."""
    request = shared.request_of(options)
    study = solve(request)
    text = report_text(study, shared.source_of(options.file))
    shared.put_either(options, request.session, text, report_object(study))
    return shared.status_of(study)
