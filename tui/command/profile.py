"""``winze profile``: band edge and density over position."""

from __future__ import annotations

from argparse import Namespace, _SubParsersAction
from typing import Any

from physics.levels import LevelSet, find_levels
from physics.wavefunction import level_state, scattering_state
from tui.command import options as shared
from tui.diagnostics import INACCURATE, CallError
from tui.report.objects import profile_object
from tui.report.tables import profile_table
from tui.session.tables import ENERGY_EV
from tui.study import Scene, set_scene

MOST_LEVELS = 1_000_000


def add(commands: _SubParsersAction[Any]) -> None:
    """Add the command."""
    parser = commands.add_parser(
        "profile",
        help="band edge and probability density over position",
        description="The density of the wave that comes in from the left at an energy, or of a "
        "level; the lowest level where neither is named.",
    )
    shared.add_common(parser)
    shared.add_window(parser, max_width=True)
    which = parser.add_mutually_exclusive_group()
    which.add_argument(
        "--energy",
        metavar="E",
        type=shared.number_in(ENERGY_EV),
        help="energy of the incoming wave, in eV",
    )
    which.add_argument(
        "--level",
        metavar="N",
        type=shared.count_up_to(MOST_LEVELS),
        help="number of a level in the window, from 1",
    )
    parser.set_defaults(run=run)


def run(options: Namespace) -> int:
    """Answer."""
    request = shared.request_of(options)
    scene = set_scene(request)
    status, number = shared.status_of_field(scene), None
    if options.energy is not None:
        density = scattering_state(scene.profile, options.energy)
    else:
        levels = find_levels(scene.profile, scene.from_eV, scene.to_eV, scene.max_width_eV)
        number = _number(levels, options.level, scene)
        density = level_state(scene.profile, levels.levels[number - 1])
        if not (levels.complete and levels.accurate):
            status = INACCURATE
    content = profile_object(density, number)
    shared.put_either(options, request.session, profile_table(density), content)
    return status


def _number(levels: LevelSet, wanted: int | None, scene: Scene) -> int:
    found = len(levels.levels)
    number = 1 if wanted is None else wanted
    if number > found:
        what = f"level {number}" if wanted is not None else "level"
        raise CallError(
            f"there is no {what}: {found} found from {scene.from_eV:g} to {scene.to_eV:g} eV, "
            f"up to {scene.max_width_eV:g} eV wide; widen the window or give --energy"
        )
    return number
