"""Levels followed from bias to bias, each under a letter of its own.

A curve lists the levels at each bias by energy; which of them is which at the next bias is found
here. With the left contact held, a level moves down by no more than the bias does, so that one
step leaves few candidates.
"""

from __future__ import annotations

import string
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from physics.curve import Curve

FloatArray = NDArray[np.float64]

SLACK_EV = 3e-3
"""A step may leave the bounds by so much: a field that is not even, a width, rounding."""
HALF = 0.5
"""A level in the middle of the stack moves by this share of the bias."""
SAME_EV = 0.02
"""Branches on both sides of a gap, carried back to zero bias, that agree this well are one."""


@dataclass(frozen=True, eq=False)
class Branch:
    """One level over bias; arrays of shape (B,), nan where it carries nothing."""

    letter: str
    energy_eV: FloatArray
    share: FloatArray
    """Share of the current that runs through it."""


@dataclass
class _Trail:
    """Points of one level as they are found: index of bias and rank there."""

    points: dict[int, int] = field(default_factory=dict)


def branches_of(curve: Curve) -> tuple[Branch, ...]:
    """Follow the levels of a curve, from the bias nearest zero outward; lowest level first."""
    energy = curve.level_eV
    if energy.shape[1] == 0:
        return ()
    start = int(np.argmin(np.abs(curve.bias_V)))
    trails = [_Trail({start: rank}) for rank in _levels_at(energy, start)]
    for step, end in ((1, curve.bias_V.size), (-1, -1)):
        for n in range(start + step, end, step):
            _take_step(curve, trails, n - step, n)
    ordered = sorted(_merged(curve, trails), key=lambda trail: _at_zero_eV(curve, trail))
    letters = _letters(len(ordered))
    return tuple(_branch(curve, trail, name) for trail, name in zip(ordered, letters, strict=True))


def letter_of(branches: tuple[Branch, ...], bias_V: FloatArray, at_V: float, energy: float) -> str:
    """Give the letter of a level at a bias between those of the curve; empty where it has none."""
    nearest = int(np.argmin(np.abs(bias_V - at_V)))
    reach = SLACK_EV + abs(float(bias_V[nearest]) - at_V)
    gaps = [(abs(float(b.energy_eV[nearest]) - energy), b.letter) for b in branches]
    return min((gap for gap in gaps if gap[0] <= reach), default=(0.0, ""))[1]


def _letters(count: int) -> list[str]:
    """Name levels a, b, ...; after z come numbers."""
    return [*string.ascii_lowercase, *map(str, range(1, max(1, count - 25)))][:count]


def _levels_at(energy_eV: FloatArray, n: int) -> list[int]:
    return [int(rank) for rank in np.flatnonzero(np.isfinite(energy_eV[n]))]


def _take_step(curve: Curve, trails: list[_Trail], before: int, n: int) -> None:
    """Match the levels at one bias to those at the one before, nearest pairs first."""
    energy, step_V = curve.level_eV, float(curve.bias_V[n] - curve.bias_V[before])
    low, high = sorted((-step_V, 0.0))
    free = _levels_at(energy, n)
    pairs = []
    for trail in trails:
        if before not in trail.points:
            continue
        was = energy[before, trail.points[before]]
        for rank in free:
            moved = energy[n, rank] - was
            if low - SLACK_EV <= moved <= high + SLACK_EV:
                pairs.append((abs(moved + HALF * step_V), rank, trail))
    for _, rank, trail in sorted(pairs, key=lambda pair: pair[:2]):
        if rank in free and n not in trail.points:
            trail.points[n] = rank
            free.remove(rank)
    trails += [_Trail({n: rank}) for rank in free]


def _at_zero_eV(curve: Curve, trail: _Trail) -> float:
    """Energy carried back to zero bias, from the point nearest to it."""
    n = min(trail.points, key=lambda n: abs(curve.bias_V[n]))
    return float(curve.level_eV[n, trail.points[n]] + HALF * curve.bias_V[n])


def _merged(curve: Curve, trails: list[_Trail]) -> list[_Trail]:
    """Join trails that never meet at one bias and are at one energy when carried back to zero."""
    merged: list[_Trail] = []
    for trail in sorted(trails, key=lambda trail: _at_zero_eV(curve, trail)):
        same = [
            other
            for other in merged
            if not other.points.keys() & trail.points.keys()
            and abs(_at_zero_eV(curve, other) - _at_zero_eV(curve, trail)) <= SAME_EV
        ]
        if same:
            same[-1].points.update(trail.points)
        else:
            merged.append(_Trail(dict(trail.points)))
    return merged


def _branch(curve: Curve, trail: _Trail, letter: str) -> Branch:
    energy = np.full(curve.bias_V.size, np.nan)
    current = np.zeros(curve.bias_V.size)
    for n, rank in trail.points.items():
        energy[n] = curve.level_eV[n, rank]
        current[n] = curve.level_current_A_per_cm2[n, rank]
    total = curve.current_density_A_per_cm2
    share = np.divide(current, total, out=np.zeros_like(total), where=total != 0.0)
    return Branch(letter, energy, share)
