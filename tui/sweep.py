"""The current curve of a session: a frozen request in, a frozen answer out.

As `study` for the levels at one bias. A first answer on a coarse grid comes at once through
``tell``; the curve is then refined where it bends, and its features are sought off the grid.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from physics.advice import structure_notes
from physics.curve import Curve, Drive, curve_at, even_biases, own_curve, slopes_at
from physics.dephasing import Dephasing, wells_of
from physics.device import (
    HOT_W_PER_CM2,
    Figures,
    Mesa,
    device_figures,
    plate_capacitance_F_per_cm2,
)
from physics.errors import EnergyError
from physics.extremes import Region, main_region, regions
from physics.field import Profile, go_on, uniform_field
from physics.levels import Level, find_levels
from physics.screening import ScreeningReport
from physics.solutions import Solutions, solutions_over
from physics.structure import Structure
from tui.session.lines import KeyPath
from tui.session.model import Session
from tui.session.refusal import SessionError
from tui.session.resolve import dephasing_of, resolve
from tui.sweep_notes import said_of_masses, said_of_screening

NEEDS_ELECTRONS = "a current needs electrons: state donors_cm3 or fermi_eV of both contacts"
STEP_V, LEAST_V, MOST_V = 0.1, 0.3, 2.0
"""A range of its own ends at a multiple of the step, between these."""
MOST_SCREENED_SLOPES = 25
"""Points of a screened curve whose slopes are computed beside them; for more it takes too long."""
NEAR_LEVEL_EV = 0.02
"""Half the window in which the level that carries a current is looked up again."""


@dataclass(frozen=True)
class SweepRequest:
    """What is asked. None: as the session says, or else as the barriers suggest."""

    session: Session
    from_V: float | None = None
    to_V: float | None = None
    points: int | None = None
    """None: the biases follow the curve's features."""


@dataclass(frozen=True, eq=False)
class Sweep:
    """The answer: curve, features, figures and notes."""

    request: SweepRequest
    structure: Structure
    from_V: float
    to_V: float
    curve: Curve
    refined: bool
    """False for a first answer, whose features are not sought yet."""
    close_slope_S_per_cm2: NDArray[np.float64] | None = None
    """dJ/dV at each bias from close differences; None where the curve's own points are close."""
    regions: tuple[Region, ...] = ()
    main: Region | None = None
    """The peak that a reader asks for."""
    figures: Figures | None = None
    screening: tuple[ScreeningReport, ...] = ()
    """How Poisson's equation was solved at each bias, where the field is the screened one."""
    notes: tuple[str, ...] = ()

    @property
    def conductance_S_per_cm2(self) -> NDArray[np.float64]:
        """Slope dJ/dV at each bias."""
        close = self.close_slope_S_per_cm2
        return self.curve.conductance_S_per_cm2 if close is None else close

    @property
    def reached(self) -> bool:
        """Whether every field converged and every current reached the stated accuracy."""
        bent = all(report.converged for report in self.screening)
        return bent and bool(self.curve.reached.all())


def sweep(
    request: SweepRequest,
    watch: Callable[[], None] = go_on,
    tell: Callable[[Sweep], None] | None = None,
) -> Sweep:
    """Answer a request.

    Parameters
    ----------
    watch : callable
        Called again and again; by raising it ends the work.
    tell : callable, optional
        Called with a first answer and after each refinement.

    Raises
    ------
    SessionError, PhysicsError
        The session does not describe something that can be computed, or no electrons are stated.
    """
    return sweep_over(resolve(request.session), request, watch, tell)


def sweep_over(
    structure: Structure,
    request: SweepRequest,
    watch: Callable[[], None] = go_on,
    tell: Callable[[Sweep], None] | None = None,
) -> Sweep:
    """As `sweep`, for a structure that is not quite the session's: as it was grown, say."""
    if structure.left.fermi_eV is None:
        path: KeyPath = ("left", "donors_cm3")
        raise SessionError("left donors_cm3", "is missing", NEEDS_ELECTRONS, path=path)
    start, stop = range_of(request, structure)
    drive, solutions = drive_of(request.session, structure, (start, stop), watch)

    def first(curve: Curve) -> Sweep:
        return Sweep(request, structure, start, stop, curve, refined=False)

    if request.points is None:
        told = None if tell is None else (lambda curve: tell(first(curve)))
        curve = own_curve(drive, start, stop, told)
    else:
        curve = curve_at(drive, even_biases(start, stop, request.points))
    return _finished(first(curve), drive, solutions)


def drive_of(
    session: Session,
    structure: Structure,
    range_V: tuple[float, float],
    watch: Callable[[], None] = go_on,
) -> tuple[Drive, Solutions | None]:
    """Say what the bands are at any bias of a range, by the session's field model.

    Returns
    -------
    drive : Drive
    solutions : Solutions, optional
        Of Poisson's equation, where the field is the screened one; they come as they are needed.
    """
    conditions = session.conditions
    solutions = None
    if conditions.field == "screened":
        solutions = solutions_over(
            structure,
            conditions.temperature_K,
            range_V,
            charge=conditions.charge,
            band=conditions.band,
            watch=watch,
        )

    def uniform(bias_V: NDArray[np.float64]) -> list[Profile]:
        return [
            replace(uniform_field(structure, bias, band=conditions.band), watch=watch)
            for bias in bias_V.tolist()
        ]

    lost = Dephasing(dephasing_of(session, structure.left.mass), wells_of(structure))
    profiles = uniform if solutions is None else solutions.profiles
    return Drive(structure, conditions.temperature_K, profiles, watch, lost), solutions


def range_of(request: SweepRequest, structure: Structure) -> tuple[float, float]:
    """Give the range of a sweep: as asked for, as the session says, or as the barriers suggest."""
    stated = request.session.sweep
    start = next(v for v in (request.from_V, stated.from_V, 0.0) if v is not None)
    suggested = max(suggested_V(structure), start + STEP_V)
    stop = next(v for v in (request.to_V, stated.to_V, suggested) if v is not None)
    if not start < stop:
        raise EnergyError(
            f"the sweep from {start:g} to {stop:g} V is empty; --to lies above --from"
        )
    return start, stop


def suggested_V(structure: Structure) -> float:
    """Bias up to which a curve is of interest: twice the highest barrier, within reason."""
    highest = max(max(layer.edge_eV, layer.right_edge_eV) for layer in structure.layers)
    wanted = STEP_V * math.ceil(2.0 * (highest - structure.left.edge_eV) / STEP_V)
    return min(max(wanted, LEAST_V), MOST_V)


def _finished(first: Sweep, drive: Drive, solutions: Solutions | None) -> Sweep:
    if _wants_close_slopes(first, solutions):
        first = replace(first, close_slope_S_per_cm2=slopes_at(drive, first.curve))
    sought = first.curve
    if first.request.points is not None and solutions is None:
        sought = own_curve(drive, first.from_V, first.to_V)  # features do not depend on the points
    found = regions(drive, sought)
    main = main_region(found, sought)
    figures = None
    if main is not None:
        (profile,) = drive.profiles(np.array([main.peak.bias_V]))
        stated = first.request.session.device
        mesa = Mesa(stated.mesa_um2, stated.series_ohm, stated.parallel_fF)
        level = carrying_level(sought, profile, main.peak.bias_V)
        if solutions is None:
            capacitance = plate_capacitance_F_per_cm2(first.structure)
        else:
            capacitance = solutions.space_charge_F_per_cm2(main.peak.bias_V)
        figures = device_figures(main, profile, level, mesa, capacitance)
    known = {} if solutions is None else solutions.known
    reports = tuple(known[bias].report for bias in sorted(known))
    done = replace(
        first, regions=found, main=main, figures=figures, screening=reports, refined=True
    )
    return replace(done, notes=_notes(done))


def _wants_close_slopes(first: Sweep, solutions: Solutions | None) -> bool:
    """Say whether slopes are computed beside the points; a field for each costs its time."""
    return solutions is None or first.curve.bias_V.size <= MOST_SCREENED_SLOPES


def carrying_level(curve: Curve, profile: Profile, bias_V: float) -> Level | None:
    """Look up the level that carries most of the current at a bias."""
    nearest = int(np.argmin(np.abs(curve.bias_V - bias_V)))
    share = np.abs(curve.level_current_A_per_cm2[nearest])
    if not np.isfinite(share).any():
        return None
    energy = float(curve.level_eV[nearest, int(np.nanargmax(share))])
    reach = NEAR_LEVEL_EV + abs(float(curve.bias_V[nearest]) - bias_V)
    low = max(energy - reach, max(profile.contact_edge_eV) + 1e-9)
    levels = find_levels(profile, low, energy + reach).levels if low < energy + reach else ()
    return min(levels, key=lambda level: abs(level.energy_eV - energy), default=None)


def _notes(done: Sweep) -> tuple[str, ...]:
    notes = [*said_of_screening(done.screening)]
    late = ~done.curve.reached
    if late.any():
        worst = done.curve.error_A_per_cm2[late] / np.maximum(
            np.abs(done.curve.current_density_A_per_cm2[late]), 1e-300
        )
        notes.append(
            f"accuracy: {int(late.sum())} of {late.size} currents miss the stated 1e-6, "
            f"the worst is known to {float(worst.max()):.0e}"
        )
    notes += [f"{note.topic}: {note.text}" for note in structure_notes(done.structure)]
    notes += said_of_masses(done.structure)
    if done.screening and done.request.points is not None:
        notes.append(f"features: they are those that {done.request.points} points can bracket")
    if done.main is None:
        notes.append("peak: the current has no peak in this range of bias")
    elif done.figures is not None and done.figures.dwell_time_s is None:
        notes.append("peak: no level carries it; it is a wave's reflection at the edges")
    if done.main is not None and done.main.valley is None:
        notes.append("valley: the current still falls at the end of the range; go further")
    if done.figures is not None and done.figures.dissipated_W_per_cm2 > HOT_W_PER_CM2:
        notes.append(
            f"burn-out: up to {done.figures.dissipated_W_per_cm2:.1e} W/cm2 turn into heat; a mesa "
            "can burn out in continuous operation: limit the current, sink the heat or pulse it, "
            "and follow your laboratory's rules"
        )
    if done.close_slope_S_per_cm2 is None:
        notes.append("conductance: dJ/dV is the slope of the polynomial through the nearest points")
    notes.append(_said_of_coherence(done))
    return tuple(notes)


def _said_of_coherence(done: Sweep) -> str:
    lost = dephasing_of(done.request.session, done.structure.left.mass)
    if lost == 0.0:
        return "coherent: no scattering is counted; a measured valley is higher, a peak rounder"
    return (
        f"coherence: wells lose it with a width of {1e3 * lost:.3g} meV; the curve without it, and "
        "one with a larger width, bracket what is measured"
    )
