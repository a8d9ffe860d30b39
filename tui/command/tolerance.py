"""``winze tolerance``: what growth errors do to results, and the yield that is left."""

from __future__ import annotations

import sys
import time
from argparse import ArgumentTypeError, Namespace, _SubParsersAction
from collections.abc import Callable
from pathlib import Path
from typing import Any

from tui.command import options as shared
from tui.diagnostics import DONE, INACCURATE, INTERRUPTED, say
from tui.report.tolerances import (
    draws_table,
    linear_said,
    tolerance_object,
    tolerance_table,
    yield_said,
)
from tui.session.refusal import printable
from tui.session.save import save_parts
from tui.session.tables import DRAWS, SEED
from tui.tolerance import Tolerance, ToleranceRequest, tolerance

MOST_JOBS = 1024
SAY_EVERY_S = 5.0
"""Of progress, on a terminal."""


def add(commands: _SubParsersAction[Any]) -> None:
    """Add the command."""
    parser = commands.add_parser(
        "tolerance",
        help="spread of results under growth errors, yield, and what each error costs",
        description="Draws the growth errors of [tolerance], computes every draw in full, and "
        "holds the results against [[spec]]. One line a result; joint yield and what each source "
        "of error costs on standard error.",
    )
    shared.add_common(parser)
    parser.add_argument(
        "--draws",
        metavar="N",
        type=shared.count_up_to(int(DRAWS.high)),
        help="number of draws, rounded up to a multiple of 8; a power of 2 is best",
    )
    parser.add_argument("--seed", metavar="N", type=_seed, help="of the draws")
    parser.add_argument(
        "--jobs",
        metavar="N",
        type=shared.count_up_to(MOST_JOBS),
        help="processes; one a core without it. The numbers do not depend on it",
    )
    parser.add_argument(
        "--each", metavar="PATH", help="also write a table of all draws, one line a draw"
    )
    parser.set_defaults(run=run)


def _seed(text: str) -> int:
    value = int(text) if text.isascii() and text.isdigit() and len(text) <= 16 else -1
    if not SEED.holds(value):
        raise ArgumentTypeError(f"{printable(text)!r} is refused: {SEED.allowed}")
    return value


def run(options: Namespace) -> int:
    """Answer."""
    session = shared.request_of(options).session
    request = ToleranceRequest(session, options.draws, options.seed, options.jobs)
    tell = None if options.json else _say_linear
    found = tolerance(request, tell=tell, progress=_progress())
    shared.put_either(options, session, tolerance_table(found), tolerance_object(found))
    if options.each is not None:
        save_parts(Path(options.each), [draws_table(found)])
    if not options.json:
        for line in yield_said(found):
            say(line)
    if found.interrupted:
        say(f"interrupted: this is the answer of {found.draws} draws")
        return INTERRUPTED
    return DONE if found.reached else INACCURATE


def _say_linear(first: Tolerance) -> None:
    for line in linear_said(first):
        say(line)


def _progress() -> Callable[[int, int, float], None] | None:
    """Say now and then how far the work is, where somebody watches a terminal."""
    if sys.stderr is None or not sys.stderr.isatty():
        return None
    said = [time.perf_counter()]

    def progress(done: int, total: int, left_s: float) -> None:
        now = time.perf_counter()
        begins = done == 0 and left_s > SAY_EVERY_S
        if begins or (done and now - said[0] >= SAY_EVERY_S):
            said[0] = now
            say(f"{done} of {total} draws computed; about {left_s:.0f} s to go")

    return progress
