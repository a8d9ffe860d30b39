"""What a current curve is bought for: peaks, valleys, onset and the steepest falls, off the grid.

A feature that the curve's points bracket is sought again on Chebyshev nodes in its bracket, whose
interpolating polynomial gives place and value; the bracket narrows to a share of itself each round
(L. N. Trefethen, Approximation Theory and Approximation Practice, ch. 2 and 18, from memory). What
is reported is the current computed at that very bias.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import Chebyshev
from numpy.typing import NDArray

from physics.curve import Curve, Drive, curve_at

FloatArray = NDArray[np.float64]

NODES = 9
"""Chebyshev nodes in a bracket."""
Place = tuple[float, float, float, float]
"""Bias, current, its error, and conductance."""
ANGLE = (np.arange(NODES) + 0.5) * np.pi / NODES
MOST_ROUNDS = 8
SETTLED, SETTLED_SLOPE = 1e-6, 1e-5
"""Size of a polynomial's last coefficients, over the largest, at which a window is small enough."""
LEAST_WINDOW_V = 1e-6
FALL_TO_SPEAK_OF = 0.05
"""Share of a peak's current that has to go for the peak to be the one that is meant."""
LEAST_DROP = 1e-4
"""Share of a peak that the current has to fall by, lest rounding makes peaks."""


@dataclass(frozen=True)
class Point:
    """A current at a bias."""

    bias_V: float
    current_density_A_per_cm2: float
    error_A_per_cm2: float


@dataclass(frozen=True)
class Slope:
    """A differential conductance at a bias, and the current there."""

    bias_V: float
    current_density_A_per_cm2: float
    conductance_S_per_cm2: float


@dataclass(frozen=True)
class Region:
    """A peak and the fall behind it."""

    peak: Point
    valley: Point | None
    """None where the current still falls at the end of the range."""
    steepest_rise: Slope | None
    """Before the peak."""
    steepest_fall: Slope | None
    """Behind it."""

    @property
    def peak_to_valley(self) -> float | None:
        """Ratio of both currents."""
        if self.valley is None or self.valley.current_density_A_per_cm2 == 0.0:
            return None
        return self.peak.current_density_A_per_cm2 / self.valley.current_density_A_per_cm2

    @property
    def onset_V(self) -> float | None:
        """Bias at which the tangent of the steepest rise meets zero current.

        None where the current rises steepest at zero bias: it has no onset.
        """
        rise = self.steepest_rise
        if rise is None or rise.conductance_S_per_cm2 == 0.0:
            return None
        onset = rise.bias_V - rise.current_density_A_per_cm2 / rise.conductance_S_per_cm2
        return onset if abs(rise.bias_V) > LEAST_WINDOW_V and onset * rise.bias_V > 0.0 else None


@dataclass(frozen=True)
class Bracket:
    """Where an extreme is sought: of the current (order 0) or of its slope (order 1)."""

    low: float
    high: float
    order: int
    sign: float
    """1 for a maximum, -1 for a minimum."""


def regions(drive: Drive, curve: Curve) -> tuple[Region, ...]:
    """Find the peaks of a curve on both sides of zero bias, by distance from it, each refined."""
    found: list[Region] = []
    for sign in (1.0, -1.0):
        side = sign * curve.bias_V >= 0.0
        x = curve.bias_V[side]
        y = curve.current_density_A_per_cm2[side]
        outward = np.argsort(sign * x)
        found += _side_regions(drive, x[outward], y[outward], sign)
    return tuple(sorted(found, key=lambda region: abs(region.peak.bias_V)))


def main_region(found: Sequence[Region], curve: Curve) -> Region | None:
    """Choose the region that a reader asks for: the first with a fall to speak of.

    At positive bias if there is one; a ripple, whose current falls by less than `FALL_TO_SPEAK_OF`,
    only where there is nothing else.
    """
    ahead = [region for region in found if region.peak.bias_V > 0.0] or list(found)
    clear = [region for region in ahead if _fall(region, curve) >= FALL_TO_SPEAK_OF]
    return next(iter(clear or ahead), None)


def _fall(region: Region, curve: Curve) -> float:
    """Share of the peak's current that is gone in the valley, or at the end of the range."""
    peak = region.peak.current_density_A_per_cm2
    end = float(curve.current_density_A_per_cm2[-1 if region.peak.bias_V > 0.0 else 0])
    least = end if region.valley is None else region.valley.current_density_A_per_cm2
    return 1.0 - least / peak


def _side_regions(drive: Drive, x: FloatArray, y: FloatArray, sign: float) -> list[Region]:
    """Regions on one side of zero; x goes outward."""
    size = sign * y
    tops = _turns(size)
    if not tops:
        return []
    brackets: list[Bracket] = []
    start = 0
    for top, bottom in tops:
        brackets.append(Bracket(*_around(x, top), 0, sign))
        if bottom is not None:
            brackets.append(Bracket(*_around(x, bottom), 0, -sign))
        brackets.append(Bracket(*_steepest(x, size, (start, top), 1.0), 1, 1.0))
        last = x.size - 1 if bottom is None else bottom
        brackets.append(Bracket(*_steepest(x, size, (top, last), -1.0), 1, -1.0))
        start = last
    places = iter(_refined(drive, brackets))
    result = []
    for _, bottom in tops:
        peak = _point(next(places))
        valley = None if bottom is None else _point(next(places))
        result.append(Region(peak, valley, _slope(next(places)), _slope(next(places))))
    return result


def _turns(size: FloatArray) -> list[tuple[int, int | None]]:
    """Find the indices of each peak and of the valley behind it, by walking outward.

    Where the range begins on a falling flank, nothing counts before the current has risen.
    """
    turns: list[tuple[int, int | None]] = []
    top = bottom = 0
    has_risen = falling = False
    for n in range(1, size.size):
        if not has_risen:
            bottom = n if size[n] < size[bottom] else bottom
            has_risen, top = size[n] - size[bottom] > LEAST_DROP * abs(size[bottom]), n
        elif not falling:
            top = n if size[n] > size[top] else top
            if size[top] - size[n] > LEAST_DROP * abs(size[top]):
                falling, bottom = True, n
        else:
            bottom = n if size[n] < size[bottom] else bottom
            if size[n] - size[bottom] > LEAST_DROP * abs(size[top]):
                turns.append((top, bottom))
                falling, top = False, n
    if falling:
        turns.append((top, None))
    return turns


def _around(x: FloatArray, n: int) -> tuple[float, float]:
    ends = sorted((float(x[max(n - 1, 0)]), float(x[min(n + 1, x.size - 1)])))
    return ends[0], ends[1]


def _steepest(
    x: FloatArray, size: FloatArray, between: tuple[int, int], sign: float
) -> tuple[float, float]:
    """Give the steps around the steepest rise or fall between two points."""
    first, last = between
    steps = sign * np.diff(size[first : last + 1]) / np.abs(np.diff(x[first : last + 1]))
    n = first + int(np.argmax(steps))
    ends = (x[max(n - 1, first)], x[min(n + 2, last)])
    return float(min(ends)), float(max(ends))


def _refined(drive: Drive, brackets: list[Bracket]) -> list[Place]:
    """Seek every bracket's extreme of the current or of its slope, all of them side by side.

    A window narrows about the best of its computed nodes until its polynomial has settled, so that
    a cusp, where a level leaves the range, is followed too.
    """
    windows = [(bracket.low, bracket.high) for bracket in brackets]
    fits = _fitted(drive, windows)
    for _ in range(MOST_ROUNDS):
        late = [n for n, fit in enumerate(fits) if not _has_settled(fit, brackets[n])]
        if not late:
            break
        again = _fitted(drive, [_narrowed(fits[n], brackets[n]) for n in late])
        for n, fit in zip(late, again, strict=True):
            fits[n] = fit
    best = [_extreme(fit, bracket) for fit, bracket in zip(fits, brackets, strict=True)]
    at = curve_at(drive, np.array(best))
    where = np.searchsorted(at.bias_V, best)
    return [
        (
            bias,
            float(at.current_density_A_per_cm2[n]),
            float(at.error_A_per_cm2[n]),
            float(fit.deriv()(bias)),
        )
        for bias, n, fit in zip(best, where, fits, strict=True)
    ]


def _has_settled(fit: Chebyshev, bracket: Bracket) -> bool:
    """Say whether the last coefficients have died away, or the window is small enough."""
    size = np.abs(fit.coef)
    tail = SETTLED_SLOPE if bracket.order else SETTLED
    narrow = float(fit.domain[1] - fit.domain[0]) <= LEAST_WINDOW_V
    return narrow or float(size[-2:].sum()) <= tail * float(size.max())


def _fitted(drive: Drive, windows: list[tuple[float, float]]) -> list[Chebyshev]:
    """Lay a polynomial through the currents at the Chebyshev nodes of each window."""
    nodes = [0.5 * (low + high) + 0.5 * (high - low) * np.cos(ANGLE) for low, high in windows]
    currents = _currents(drive, np.concatenate(nodes)).reshape(len(nodes), NODES)
    return [
        Chebyshev.fit(x, y, NODES - 1, domain=list(window))
        for x, y, window in zip(nodes, currents, windows, strict=True)
    ]


def _narrowed(fit: Chebyshev, bracket: Bracket) -> tuple[float, float]:
    """Give the window between the neighbours of the best node, or of the steepest step."""
    low, high = float(fit.domain[0]), float(fit.domain[1])
    nodes = np.sort(0.5 * (low + high) + 0.5 * (high - low) * np.cos(ANGLE))
    values = bracket.sign * fit(nodes)
    best = int(np.argmax(np.diff(values) / np.diff(nodes) if bracket.order else values))
    last = best + bracket.order
    start = low if best == 0 else float(nodes[best - 1])
    stop = high if last >= NODES - 1 else float(nodes[last + 1])
    return start, stop


def _extreme(fit: Chebyshev, bracket: Bracket) -> float:
    """Find the place of the largest ``sign`` times derivative of that order, ends included."""
    sought = fit.deriv(bracket.order) if bracket.order else fit
    low, high = float(fit.domain[0]), float(fit.domain[1])
    roots = [complex(root) for root in sought.deriv().roots()]
    inside = [r.real for r in roots if abs(r.imag) < 1e-9 and low < r.real < high]
    return max([low, high, *inside], key=lambda x: bracket.sign * float(sought(x)))


def _currents(drive: Drive, bias_V: FloatArray) -> FloatArray:
    """Currents in the order of the biases, which may repeat."""
    curve = curve_at(drive, bias_V)
    found: FloatArray = curve.current_density_A_per_cm2[np.searchsorted(curve.bias_V, bias_V)]
    return found


def _point(place: Place) -> Point:
    return Point(*place[:3])


def _slope(place: Place) -> Slope:
    return Slope(place[0], place[1], place[3])
