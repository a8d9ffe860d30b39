"""``winze levels``: every pole of a window, complete and proved so."""

from __future__ import annotations

from argparse import Namespace, _SubParsersAction
from typing import Any

from tui.command import options as shared
from tui.report.objects import advice_object, levels_object
from tui.report.tables import levels_table
from tui.study import solve


def add(commands: _SubParsersAction[Any]) -> None:
    """Add the command."""
    parser = commands.add_parser(
        "levels",
        help="energies, widths and lifetimes of all levels in a window",
        description="Find every level with its energy in a window and its width up to a limit; "
        "without a window, from the lowest to the highest band edge.",
    )
    shared.add_common(parser)
    shared.add_window(parser, max_width=True)
    parser.set_defaults(run=run)


def run(options: Namespace) -> int:
    """Answer."""
    request = shared.request_of(options)
    study = solve(request)
    content = levels_object(study.levels) | advice_object(study.advice)
    shared.put_either(options, request.session, levels_table(study.levels), content)
    if not options.json:
        shared.say_notes(study)
    return shared.status_of(study)
