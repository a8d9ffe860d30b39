"""What is read off at the energy in hand: T, dwell time, and the density there."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from physics.levels import Level
from physics.wavefunction import Density, level_state, scattering_state
from tui.study import Study, scatter_scene


@dataclass(frozen=True, eq=False)
class Reading:
    """The answer at one energy, or for one level."""

    energy_eV: float
    number: int | None
    """Number of the level that the energy is snapped to, from 1."""
    level: Level | None
    density: Density | None
    """None where both contacts are closed and no level is in hand."""
    transmission: float
    log10_transmission: float
    dwell_time_s: float


def read_energy(study: Study, energy_eV: float) -> Reading:
    """Read off at an energy: the density is that of the wave that comes in."""
    lowest = min(study.profile.contact_edge_eV)
    density = scattering_state(study.profile, energy_eV) if energy_eV > lowest else None
    return _reading(study, energy_eV, None, None, density)


def read_level(study: Study, number: int) -> Reading:
    """Read off a level, counted from 1: the density is its own."""
    level = study.levels.levels[number - 1]
    density = level_state(study.profile, level)
    return _reading(study, level.energy_eV, number, level, density)


def _reading(
    study: Study, energy_eV: float, number: int | None, level: Level | None, density: Density | None
) -> Reading:
    at = scatter_scene(study.scene, np.array([energy_eV]))
    return Reading(
        energy_eV=energy_eV,
        number=number,
        level=level,
        density=density,
        transmission=float(at.transmission[0]),
        log10_transmission=float(at.log10_transmission[0]),
        dwell_time_s=float(at.dwell_time_s[0]),
    )
