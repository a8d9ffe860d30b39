"""``winze iv``: current over bias, with peak, valley and device figures."""

from __future__ import annotations

from argparse import Namespace, _SubParsersAction
from typing import Any

from physics import ranges
from tui.command import options as shared
from tui.diagnostics import DONE, INACCURATE, CallError, say
from tui.report.currents import features_said, sweep_object, sweep_table
from tui.sweep import SweepRequest, sweep

MOST_POINTS = 10_000


def add(commands: _SubParsersAction[Any]) -> None:
    """Add the command."""
    parser = commands.add_parser(
        "iv",
        help="current over bias, peak, valley and device figures",
        description="Tsu-Esaki current density over bias, with an error for each point; without "
        "--points, on biases that follow the curve's features.",
    )
    shared.add_common(parser)
    bias = shared.number_in(ranges.BIAS_V)
    parser.add_argument(
        "--from", dest="from_V", metavar="V", type=bias, help="lowest bias, in V; 0 without it"
    )
    parser.add_argument("--to", dest="to_V", metavar="V", type=bias, help="highest bias, in V")
    parser.add_argument(
        "--points",
        metavar="N",
        type=shared.count_up_to(MOST_POINTS),
        help="number of evenly spaced biases",
    )
    parser.set_defaults(run=run)


def run(options: Namespace) -> int:
    """Answer."""
    if options.bias is not None:
        raise CallError("iv: the bias is what varies; use --from and --to instead of --bias")
    session = shared.request_of(options).session
    found = sweep(SweepRequest(session, options.from_V, options.to_V, options.points))
    shared.put_either(options, session, sweep_table(found), sweep_object(found))
    if not options.json:
        for line in features_said(found):
            say(line)
        for note in found.notes:
            say(f"note: {note}")
    return DONE if found.reached else INACCURATE
