"""Levels followed from bias to bias by continuity, so that each keeps its number.

A level is expected where its last two energies point to; the nearest pair of expectation and level
is joined first, and what is left over begins a track of its own. Tracks are numbered by energy at
the bias nearest zero, those that come later behind them.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from physics.curve import Curve

FloatArray = NDArray[np.float64]

FIRST_SLOPE = -0.5
"""Energy over bias that a new track expects: a level in the middle of an even drop."""
REACH_EV, REACH_PER_V = 3e-3, 0.7
"""Distance from the expectation within which a level is the track's: at least, and per volt of the
step."""


def followed(curve: Curve) -> tuple[FloatArray, FloatArray]:
    """Arrange a curve's levels by track.

    Returns
    -------
    energy_eV, current_A_per_cm2 : ndarray, shape (B, K)
        Of each track at each bias; nan where it is not there.
    """
    biases = curve.bias_V.size
    start = int(np.argmin(np.abs(curve.bias_V)))
    rank = np.full(curve.level_eV.shape, -1)
    count = 0
    for order in (range(start, biases), range(start, -1, -1)):
        count = _follow(curve, list(order), rank, count)
    energy, current = (np.full((biases, count), np.nan) for _ in range(2))
    row, column = np.nonzero(rank >= 0)
    energy[row, rank[row, column]] = curve.level_eV[row, column]
    current[row, rank[row, column]] = curve.level_current_A_per_cm2[row, column]
    return energy, current


def _follow(curve: Curve, order: list[int], rank: NDArray[np.int64], count: int) -> int:
    """Give the levels of one row after the other their track; the number of tracks so far."""
    seen: dict[int, tuple[float, float, float]] = {}  # track: bias, energy, slope
    for n in order:
        bias, levels = float(curve.bias_V[n]), curve.level_eV[n]
        free = [k for k in np.flatnonzero(np.isfinite(levels)).tolist() if rank[n, k] < 0]
        pairs = sorted(
            (abs(energy + slope * (bias - last) - float(levels[k])), track, k)
            for track, (last, energy, slope) in seen.items()
            for k in free
            if track not in rank[n]
        )
        for distance, track, k in pairs:
            reach = REACH_EV + REACH_PER_V * abs(bias - seen[track][0])
            if rank[n, k] < 0 and track not in rank[n] and distance <= reach:
                rank[n, k] = track
        for k in free:
            if rank[n, k] < 0:
                rank[n, k] = count
                count += 1
        _remember(seen, bias, levels, rank[n])
    return count


def _remember(
    seen: dict[int, tuple[float, float, float]],
    bias_V: float,
    level_eV: FloatArray,
    rank: NDArray[np.int64],
) -> None:
    for k in np.flatnonzero(rank >= 0).tolist():
        track, energy = int(rank[k]), float(level_eV[k])
        slope = FIRST_SLOPE
        if track in seen and bias_V != seen[track][0]:
            slope = (energy - seen[track][1]) / (bias_V - seen[track][0])
        seen[track] = (bias_V, energy, slope)
