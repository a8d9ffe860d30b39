"""``winze report``: the whole answer for a reader."""

from __future__ import annotations

from argparse import Namespace, _SubParsersAction
from typing import Any

from tui.command import options as shared
from tui.diagnostics import INACCURATE
from tui.report.currents import sweep_object
from tui.report.objects import report_object
from tui.report.text import report_text
from tui.study import solve
from tui.sweep import SweepRequest, sweep


def add(commands: _SubParsersAction[Any]) -> None:
    """Add the command."""
    parser = commands.add_parser(
        "report",
        help="the whole answer, as text to read",
        description="Stack, levels, transmission, current and notes in one text.",
    )
    shared.add_common(parser)
    shared.add_window(parser, max_width=True)
    parser.set_defaults(run=run)


def run(options: Namespace) -> int:
    """Answer."""
    request = shared.request_of(options)
    study = solve(request)
    has_electrons = study.scene.structure.left.fermi_eV is not None
    found = sweep(SweepRequest(request.session)) if has_electrons else None
    text = report_text(study, shared.source_of(options.file), found)
    content = report_object(study) | {"current": None if found is None else sweep_object(found)}
    shared.put_either(options, request.session, text, content)
    return shared.status_of(study) if found is None or found.reached else INACCURATE
