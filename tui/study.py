"""The core of both front ends: a frozen request in, a frozen answer out."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from physics.advice import Advice, advise
from physics.dephasing import Dephasing, scatter_dephased, wells_of
from physics.errors import EnergyError
from physics.field import Profile, go_on, uniform_field, valence_top
from physics.levels import LevelSet, find_levels
from physics.poisson import screened_field
from physics.scattering import ENERGIES_AT_ONCE, Scattering, scatter
from physics.screening import ScreeningReport
from physics.spectrum import adaptive_spectrum
from physics.structure import Structure
from tui.session.model import Conditions, Session
from tui.session.resolve import dephasing_of, resolve

FLAT_EV = 1e-3
"""A stack whose edges differ by less has no barrier to take a window from."""
ABOVE_VALENCE_EV = 1e-3
"""A window taken from the edges begins this far above any valence band, where masses vanish."""
ABOVE_FLAT_EV = 0.5
"""Then the window reaches this far above the edge."""


@dataclass(frozen=True)
class Request:
    """What is asked. None: as the session's view says, or else as the band edges suggest."""

    session: Session
    from_eV: float | None = None
    to_eV: float | None = None
    max_width_eV: float | None = None


@dataclass(frozen=True, eq=False)
class Scene:
    """A session resolved: its numbers, the field over them, and the window."""

    request: Request
    structure: Structure
    profile: Profile
    from_eV: float
    to_eV: float
    max_width_eV: float
    dephasing_eV: float = 0.0
    """Width by which lost coherence broadens levels in wells; 0 for the coherent answer."""
    screening: ScreeningReport | None = None
    """How Poisson's equation was solved; None where the field is uniform."""

    @cached_property
    def dephasing(self) -> Dephasing:
        """How coherence is lost, and in which layers."""
        return Dephasing(self.dephasing_eV, wells_of(self.structure))


@dataclass(frozen=True, eq=False)
class Study:
    """The answer: levels, spectrum and notes for a scene."""

    scene: Scene
    levels: LevelSet
    spectrum: Scattering
    advice: tuple[Advice, ...]

    @property
    def profile(self) -> Profile:
        """Edges and masses over position."""
        return self.scene.profile

    @property
    def reached(self) -> bool:
        """Whether the count was proved and every stated accuracy met."""
        screening = self.scene.screening
        bent = screening is None or screening.converged
        return bent and self.levels.complete and self.levels.accurate


def set_scene(request: Request, watch: Callable[[], None] = go_on) -> Scene:
    """Resolve a session and fix the energy window.

    Parameters
    ----------
    request : Request
        What is asked.
    watch : callable
        Called again and again while the scene is computed on; by raising it ends the work.

    Raises
    ------
    SessionError, PhysicsError
        The session does not describe something that can be computed.
    """
    structure = resolve(request.session)
    profile, screening = field_over(request.session.conditions, structure, watch)
    profile = replace(profile, watch=watch)
    low, high = energy_window(profile)
    view = request.session.view
    start = _first(request.from_eV, view.from_eV, low)
    stop = _first(request.to_eV, view.to_eV, high)
    if not start <= stop:  # one energy is a window for T, though not for levels
        raise EnergyError(
            f"the energy window from {start:g} to {stop:g} eV is empty; "
            f"the band edges reach from {low:g} to {high:g} eV"
        )
    width = _first(request.max_width_eV, view.max_width_eV)
    lost = dephasing_of(request.session, structure.left.mass)
    return Scene(request, structure, profile, start, stop, width, lost, screening)


def solve(request: Request, watch: Callable[[], None] = go_on) -> Study:
    """Answer a request; see `set_scene` for ``watch``.

    Raises
    ------
    SessionError, PhysicsError
        As `set_scene`.
    """
    scene = set_scene(request, watch)
    levels = find_levels(scene.profile, scene.from_eV, scene.to_eV, scene.max_width_eV)
    lost = scene.dephasing
    spectrum = adaptive_spectrum(scene.profile, scene.from_eV, scene.to_eV, levels, lost)
    temperature = request.session.conditions.temperature_K
    notes = advise(
        scene.structure,
        scene.profile,
        temperature,
        levels,
        spectrum,
        dephasing=lost,
        screening=scene.screening,
    )
    return Study(scene, levels, spectrum, notes)


def scatter_scene(scene: Scene, energy_eV: NDArray[np.float64]) -> Scattering:
    """T and R with lost coherence, all else of the coherent wave, at given energies (E,)."""
    plain = scatter(scene.profile, energy_eV)
    if not scene.dephasing.acts:
        return plain
    lost = scatter_dephased(scene.profile, scene.structure, energy_eV, scene.dephasing_eV)
    return replace(
        plain,
        transmission=lost.transmission,
        reflection=lost.reflection,
        log10_transmission=lost.log10_transmission,
    )


def scatter_scene_in_parts(scene: Scene, energy_eV: NDArray[np.float64]) -> Iterator[Scattering]:
    """As `scatter_scene`, a part of the energies at a time."""
    for first in range(0, energy_eV.size, ENERGIES_AT_ONCE):
        yield scatter_scene(scene, energy_eV[first : first + ENERGIES_AT_ONCE])


def field_over(
    conditions: Conditions, structure: Structure, watch: Callable[[], None] = go_on
) -> tuple[Profile, ScreeningReport | None]:
    """Lay the field of the conditions over a structure; how it was solved, if it was screened."""
    if conditions.field == "uniform":
        return uniform_field(structure, conditions.bias_V, band=conditions.band), None
    screened = screened_field(
        structure,
        conditions.bias_V,
        conditions.temperature_K,
        charge=conditions.charge,
        band=conditions.band,
        watch=watch,
    )
    return screened.profile, screened.report


def energy_window(profile: Profile) -> tuple[float, float]:
    """Give the window that shows a profile: from its lowest to its highest edge, in eV.

    Where the mass goes with the energy, it begins above the valence bands.
    """
    floor = valence_top(profile)[0] + ABOVE_VALENCE_EV
    low, high = max(profile.lowest_eV, floor), profile.highest_eV
    return low, high if high - low >= FLAT_EV else max(low, high) + ABOVE_FLAT_EV


def _first(*values: float | None) -> float:
    return next(value for value in values if value is not None)
