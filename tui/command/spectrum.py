"""``winze spectrum``: what gets through, over energy."""

from __future__ import annotations

from argparse import Namespace, _SubParsersAction
from typing import Any

import numpy as np

from tui.command import options as shared
from tui.report.objects import advice_object, spectrum_document_parts, spectrum_object
from tui.report.tables import spectrum_table, spectrum_table_parts
from tui.study import scatter_scene_in_parts, set_scene, solve

MOST_POINTS = 10_000_000


def add(commands: _SubParsersAction[Any]) -> None:
    """Add the command."""
    parser = commands.add_parser(
        "spectrum",
        help="transmission and reflection over energy",
        description="T and R on evenly spaced energies, both ends included; without --points on a "
        "grid that resolves every level of the window, however narrow.",
    )
    shared.add_common(parser)
    shared.add_window(parser, max_width=True)
    parser.add_argument(
        "--points",
        metavar="N",
        type=shared.count_up_to(MOST_POINTS),
        help="number of evenly spaced energies",
    )
    parser.set_defaults(run=run)


def run(options: Namespace) -> int:
    """Answer."""
    request = shared.request_of(options)
    if options.points is not None:
        scene = set_scene(request)
        energy = np.linspace(scene.from_eV, scene.to_eV, options.points)
        parts = scatter_scene_in_parts(scene, energy)
        text = (
            spectrum_document_parts(options.command, request.session, parts)
            if options.json
            else spectrum_table_parts(parts)
        )
        shared.put_parts(options, text)
        return shared.status_of_field(scene)
    study = solve(request)
    content = spectrum_object(study.spectrum) | advice_object(study.advice)
    content["levels_complete"] = study.levels.complete
    shared.put_either(options, request.session, spectrum_table(study.spectrum), content)
    if not options.json:
        shared.say_notes(study)
    return shared.status_of(study)
