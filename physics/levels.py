"""Levels: complex poles of the scattering matrix, complete and proved so.

A level is a zero E_r - i Gamma / 2 of the outgoing-wave condition (`outgoing`). The window is cut
at the contacts' edges, between which the sheet is fixed. Below both edges the levels are bound and
Sturm's theorem counts them exactly. Elsewhere the closed stack's eigenvalues, found by counting
nodes and hence blind to no width, start Aberth's iteration, and the argument principle proves the
result complete or finds what is missing (`rootfinding`). Widths come from the flux (`leaving`).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import partial
from typing import ClassVar, Literal

import numpy as np
from numpy.typing import NDArray

from physics.constants import HBAR_EV_S
from physics.field import Profile, without_runways
from physics.leaving import STOPS, Leaving, leaving_states
from physics.outgoing import Sheet, closed_stack_energies, mismatch
from physics.rootfinding import MOST_POINTS, Rectangle, distinct, polish, zeros_in
from physics.sectors import Sectors, cut
from physics.windows import SAME_EV, check_window, lowest_allowed_eV, strips

ComplexArray = NDArray[np.complex128]
FloatArray = NDArray[np.float64]

DEFAULT_MAX_WIDTH_EV = 0.1
STRONG = 0.25
"""Share of the largest density from which a wave counts as strong."""
COARSE, FINE = 1e-7, 1e-16
"""Bracket widths in eV: enough to start a complex iteration; as far as a double goes."""
MARGIN = 0.15
"""Share of a window's span that starting points are gathered from beyond its ends."""
WIDTH_ERROR = 1e-9
"""Relative error of a width that stands alone; against 50 digits, 1e-13 was seen."""
MIXING_EV = 1e-15
"""Rounding of the energy, with a margin of four: over the distance of two levels it is the part of
one state that is taken for the other."""
GAP_ERROR_EV = 2e-13
"""Uncertainty of a distance between two levels that all but coincide, seen in trials."""
LEVELS_AT_ONCE = 4_000_000
"""Matrix elements held at once while states are computed."""
CONTOUR_WORK = 200_000_000
"""Points of a contour times sectors, some 10 s, from which the proof is given up."""
THRESHOLD_EV = 1e-11
"""The contour stays this far from the ends of a strip, where a contact's edge may branch."""
HEIGHT = 1.0377
"""Above the axis the box is as high as deep, but for a factor that keeps the contour's points
(dyadic fractions of its sides) off the axis: a window may end on a level."""
REAL_AXIS_EV = 1e-9
"""Rounding that lifts a narrow level's pole above the real axis."""


@dataclass(frozen=True)
class Level:
    """One level of the stack."""

    energy_eV: float
    width_eV: float
    """Full width Gamma; 0 for a bound level, or where it underflows a double."""
    log10_width_eV: float
    """Its decadic logarithm, good however narrow; -inf for a bound level."""
    left_width_eV: float
    right_width_eV: float
    lifetime_s: float
    """hbar / Gamma; inf for a bound level."""
    peak_transmission: float
    """4 Gamma_L Gamma_R / Gamma^2 (Ricco and Azbel, Phys. Rev. B 29, 1970 (1984)), 0 if closed."""
    kind: Literal["bound", "quasi-bound"]
    nodes: int
    """Nodes of the wave, the weak outgoing ends left out."""
    share_by_layer: tuple[float, ...]
    """Probability in each layer; the rest of 1 is in contacts: in tails, or where screening bends
    their edges."""
    width_error: float
    """Bound on the relative error of the widths; large only for levels that all but coincide."""


@dataclass(frozen=True)
class LevelSet:
    """The levels of a window."""

    STATED_WIDTH_ERROR: ClassVar[float] = 1e-6
    """Relative accuracy that widths are meant to have."""

    levels: tuple[Level, ...]
    """Sorted by energy."""
    complete: bool
    """Whether the count was proved and met."""
    counted: int
    """Levels in the window by the count; those that were found where it could not be proved."""
    from_eV: float
    to_eV: float
    max_width_eV: float

    @property
    def accurate(self) -> bool:
        """Whether every width reaches the stated accuracy."""
        return all(level.width_error <= self.STATED_WIDTH_ERROR for level in self.levels)


@dataclass(frozen=True, eq=False)
class _Strip:
    """Poles found between two neighbouring contact edges."""

    sheet: Sheet
    poles: ComplexArray
    missing: int
    proved: bool


def find_levels(
    profile: Profile, from_eV: float, to_eV: float, max_width_eV: float = DEFAULT_MAX_WIDTH_EV
) -> LevelSet:
    """Find every level with its energy in a window and its width up to a limit.

    Parameters
    ----------
    profile : Profile
        Edges and masses over position.
    from_eV, to_eV : float
        The window of the levels' energy.
    max_width_eV : float
        Largest width.

    Raises
    ------
    EnergyError
        The window is empty, or beyond `WINDOW_LIMIT_EV`, or the width limit is not positive, or
        more levels lie in it than can be computed in reasonable time, or it reaches into a valence
        band.
    StructureError
        The stack is too thick for these energies.
    """
    check_window(from_eV, to_eV, max_width_eV)
    levels: list[Level] = []
    counted, complete = 0, True
    core = without_runways(profile)
    for low, high in strips(profile, from_eV, to_eV):
        strip = _find_poles(core, low, high, max_width_eV)
        found = [level for level in _describe(profile, strip) if level.width_eV <= max_width_eV]
        levels += found
        counted += len(found) + strip.missing
        complete = complete and strip.proved
    levels.sort(key=lambda level: level.energy_eV)
    counted = counted if complete else len(levels)
    return LevelSet(tuple(levels), complete, counted, from_eV, to_eV, max_width_eV)


def follow_levels(profile: Profile, before: LevelSet) -> LevelSet:
    """Find levels again in a profile that has changed a little, from where they were.

    Nothing is proved anew; where a level is lost on the way, all are found from scratch.
    """
    levels: list[Level] = []
    core = without_runways(profile)
    for low, high in strips(profile, before.from_eV, before.to_eV):
        known = [level for level in before.levels if low <= level.energy_eV < high]
        poles = np.array([complex(level.energy_eV, -0.5 * level.width_eV) for level in known])
        if high <= min(profile.contact_edge_eV):  # all bound
            strip = _find_poles(core, low, high, before.max_width_eV)
        elif poles.size:
            sheet = Sheet(*(0.5 * (low + high) > edge for edge in profile.contact_edge_eV))
            depth = 2.0 * before.max_width_eV
            sectors = cut(core, low, high, depth_eV=depth)
            box = Rectangle(low, high, -depth, REAL_AXIS_EV)
            found = polish(partial(mismatch, core, sectors, sheet), poles, poles[:0], box)
            strip = _Strip(sheet, distinct(found[box.holds(found)]), 0, proved=before.complete)
        else:
            continue
        levels += _describe(profile, strip)
    if len(levels) != len(before.levels):
        return find_levels(profile, before.from_eV, before.to_eV, before.max_width_eV)
    levels.sort(key=lambda level: level.energy_eV)
    return replace(before, levels=tuple(levels))


def levels_at(profile: Profile, sheet: Sheet, pole_eV: ComplexArray) -> tuple[Level, ...]:
    """Describe levels whose poles (N,) are known, all of them on one sheet."""
    return tuple(_describe(profile, _Strip(sheet, pole_eV, 0, proved=False)))


def _mixing(poles: ComplexArray) -> FloatArray:
    """Bound the relative error of each width that neighbours bring about, shape (N,)."""
    if poles.size < 2:
        return np.full(poles.size, WIDTH_ERROR)
    gaps = np.abs(np.diff(poles))
    nearest = np.minimum(np.append(gaps, np.inf), np.append(np.inf, gaps))
    apart = np.maximum(nearest - GAP_ERROR_EV, MIXING_EV)
    bound: FloatArray = WIDTH_ERROR + MIXING_EV / apart
    return bound


def _find_poles(profile: Profile, low: float, high: float, max_width_eV: float) -> _Strip:
    middle = 0.5 * (low + high)
    sheet = Sheet(middle > profile.contact_edge_eV[0], middle > profile.contact_edge_eV[1])
    if sheet.closed:
        sectors = cut(profile, low, high)
        bound = closed_stack_energies(profile, sectors, sheet, (low, high), FINE)
        return _Strip(sheet, bound.astype(np.complex128), 0, proved=True)
    depth = 0.5 * max_width_eV * (1.0 + 1e-9)
    height = HEIGHT * max(depth, 0.1 * (high - low))
    margin = MARGIN * (high - low)
    floor = min(low, lowest_allowed_eV(profile))
    wide = (max(low - margin, floor), high + margin)
    sectors = cut(profile, *wide, depth_eV=max(depth, height))
    starts = closed_stack_energies(profile, sectors, sheet, wide, COARSE)
    inset = min(THRESHOLD_EV, 0.01 * (high - low))
    box = Rectangle(low + inset, high - inset, -depth, height)
    zeros = zeros_in(
        lambda energy: mismatch(profile, sectors, sheet, energy),
        box,
        starts.astype(np.complex128),
        most_points=min(MOST_POINTS, CONTOUR_WORK // sectors.count),
    )
    reach = Rectangle(low - SAME_EV, high + SAME_EV, -np.inf, REAL_AXIS_EV)
    inside = reach.holds(zeros.points)
    missing = 0 if zeros.counted < 0 else zeros.counted - int(box.holds(zeros.points).sum())
    return _Strip(sheet, zeros.points[inside], max(missing, 0), zeros.proved)


def _describe(profile: Profile, strip: _Strip) -> list[Level]:
    if strip.poles.size == 0:
        return []
    depth = float(np.abs(strip.poles.imag).max())
    low, high = float(strip.poles.real.min()), float(strip.poles.real.max())
    sectors = cut(profile, low, high, depth_eV=depth, stops=STOPS)
    chunk = max(1, LEVELS_AT_ONCE // (len(STOPS) * 4 * sectors.count))
    mixing = _mixing(strip.poles)
    levels: list[Level] = []
    for first in range(0, strip.poles.size, chunk):
        profile.watch()
        poles = strip.poles[first : first + chunk]
        states = leaving_states(profile, sectors, strip.sheet, poles)
        levels += [
            _level(profile, sectors, states, n, float(mixing[first + n])) for n in range(poles.size)
        ]
    return levels


def _level(
    profile: Profile, sectors: Sectors, states: Leaving, n: int, width_error: float
) -> Level:
    log_left, log_right = (float(log) for log in states.log_width_eV[:, n])
    log_width = float(np.logaddexp(log_left, log_right))
    width = math.exp(log_width)
    layers = profile.layer_index[sectors.piece_index] + 1  # 0: in the left contact
    share = np.bincount(layers, states.content[:, n], profile.layer_count + 2)[1:-1]
    energy = float(states.energy_eV[n].real)
    bound = states.sheet.closed
    balance = -math.inf if bound else log_left + log_right - 2.0 * log_width
    return Level(
        energy_eV=energy,
        width_eV=width,
        log10_width_eV=log_width / math.log(10.0),
        left_width_eV=math.exp(log_left),
        right_width_eV=math.exp(log_right),
        lifetime_s=HBAR_EV_S / width if width > 0.0 else math.inf,
        peak_transmission=min(1.0, 4.0 * math.exp(balance)),
        kind="bound" if bound else "quasi-bound",
        nodes=_nodes(profile, sectors, states.psi[:, n], energy),
        share_by_layer=tuple(float(value) for value in share),
        width_error=0.0 if bound else width_error,
    )


def _nodes(profile: Profile, sectors: Sectors, psi: ComplexArray, energy_eV: float) -> int:
    """Sign changes of the wave where it is forbidden or strong, and everywhere in between.

    The outgoing wave in a spacer turns its phase and has no nodes to speak of; it is left out
    as long as it is weak.
    """
    forbidden = np.maximum(profile.edge_left_eV, profile.edge_right_eV) > energy_eV
    density = np.abs(psi) ** 2
    strong = np.maximum(density[1:], density[:-1]) >= STRONG * density.max()
    places = np.flatnonzero(forbidden[sectors.piece_index] | strong)
    signs = np.sign(psi[places[0] : places[-1] + 2].real)
    signs = signs[signs != 0.0]
    return int(np.count_nonzero(signs[1:] != signs[:-1]))
