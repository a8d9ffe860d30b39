"""Zeros of an analytic function in a rectangle of the complex plane, with proof. No physics.

Known zeros are polished together by Aberth's iteration (O. Aberth, Math. Comp. 27, 339 (1973)),
which keeps them apart however close they lie. Then the argument principle is applied to what is
left after dividing the known zeros out: its winding number round the rectangle is the number of
zeros still missing, and its moments say where they are (L. M. Delves and J. N. Lyness, Math. Comp.
21, 543 (1967)). Dividing first keeps the contour smooth even where a known zero lies on it.

The winding is trusted only where the phase is resolved: each step of the contour has to be short
against the function's logarithmic derivative at both of its ends, and the step's change of
logarithm has to agree with the trapezoidal rule. Where that cannot be had, the proof is refused.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

ComplexArray = NDArray[np.complex128]
FloatArray = NDArray[np.float64]
Function = Callable[[ComplexArray], tuple[ComplexArray, ComplexArray]]
"""Points (E,) to values and derivatives, each (E,), over one positive factor per point that makes
the terms a value is the sum of about 1."""

ABERTH_ROUNDS = 60
STEP_LIMIT = 1.0
"""Longest contour step times logarithmic derivative: a zero nearby can't slip through unseen."""
AGREEMENT = 0.25
"""Largest difference between a step's change of logarithm and the trapezoidal rule."""
FIRST_STEPS = 16
"""Steps a side before refinement."""
REFINEMENTS = 40
LOST = 1e-13
"""A value below this on the contour is rounding: the function's phase is not known there."""
MOST_POINTS = 200_000
MOMENTS_AT_ONCE = 3
"""Zeros taken from the moments of one rectangle; more, and it is halved first."""
MAX_DEPTH = 24
ROUNDING = 4e-16
NOISE = 1e-10
"""Relative step below which an iterate that stopped improving has met the function's rounding."""
STALLS = 4
"""Steps without improvement that end an iteration there."""


@dataclass(frozen=True)
class Rectangle:
    """A rectangle in the complex plane."""

    left: float
    right: float
    bottom: float
    top: float

    def holds(self, points: ComplexArray) -> NDArray[np.bool_]:
        """Whether each point lies inside."""
        inside = (points.real >= self.left) & (points.real <= self.right)
        return inside & (points.imag >= self.bottom) & (points.imag <= self.top)

    def spread(self) -> Rectangle:
        """Widen to twice the size; iterates that leave it are given up."""
        across, up = 0.5 * (self.right - self.left), 0.5 * (self.top - self.bottom)
        return Rectangle(self.left - across, self.right + across, self.bottom - up, self.top + up)

    def halves(self) -> tuple[Rectangle, Rectangle]:
        """Cut across the longer side, off the middle so that symmetric zeros are not hit."""
        if self.right - self.left >= self.top - self.bottom:
            at = self.left + 0.4837 * (self.right - self.left)
            return (
                Rectangle(self.left, at, self.bottom, self.top),
                Rectangle(at, self.right, self.bottom, self.top),
            )
        at = self.bottom + 0.4837 * (self.top - self.bottom)
        return (
            Rectangle(self.left, self.right, self.bottom, at),
            Rectangle(self.left, self.right, at, self.top),
        )


@dataclass(frozen=True, eq=False)
class Zeros:
    """Zeros found, and what is proved about them."""

    points: ComplexArray
    """Every distinct zero found, inside the rectangle or near it."""
    counted: int
    """Zeros inside by the argument principle; -1 where the phase could not be resolved."""
    proved: bool
    """Whether the zeros found inside are all there are."""


@dataclass(frozen=True, eq=False)
class Contour:
    """A closed path with the logarithmic derivative of the deflated function."""

    point: ComplexArray
    log_slope: ComplexArray
    log_step: ComplexArray
    """Change of logarithm along each step."""
    resolved: bool


def zeros_in(
    function: Function, box: Rectangle, starts: ComplexArray, most_points: int = MOST_POINTS
) -> Zeros:
    """Find every zero in a rectangle.

    Parameters
    ----------
    function : callable
        Analytic in the rectangle; see `Function`.
    box : Rectangle
        Where the zeros are wanted.
    starts : ndarray, shape (N,)
        Guesses; they decide how soon the search ends, not what it finds.
    most_points : int
        Points of one contour from which the proof is given up rather than waited for.
    """
    known = distinct(polish(function, starts, np.empty(0, dtype=np.complex128), box.spread()))
    known, missing = _search(function, box, known, 0, most_points)
    inside = int(box.holds(known).sum())
    if missing is None:
        return Zeros(known, -1, proved=False)
    return Zeros(known, inside + missing, proved=missing == 0)


def _search(
    function: Function, box: Rectangle, known: ComplexArray, depth: int, most_points: int
) -> tuple[ComplexArray, int | None]:
    """Complete the known zeros inside a box; also say how many are still missing."""
    contour = walk(function, box, known, most_points)
    if not contour.resolved:
        return known, None
    missing = winding(contour)
    if missing <= 0 or depth > MAX_DEPTH:
        return known, missing
    if missing <= MOMENTS_AT_ONCE:
        guesses = from_moments(contour, missing)
        more = distinct(np.append(known, polish(function, guesses, known, box.spread())))
        if box.holds(more).sum() - box.holds(known).sum() == missing:
            return _search(function, box, more, MAX_DEPTH + 1, most_points)
        known = more
    total = 0
    for half in box.halves():
        known, left_over = _search(function, half, known, depth + 1, most_points)
        if left_over is None:
            return known, None
        total += left_over
    return known, total


def polish(
    function: Function, starts: ComplexArray, fixed: ComplexArray, within: Rectangle
) -> ComplexArray:
    """Drive guesses to zeros together, away from each other and from the fixed ones.

    Returns
    -------
    ndarray
        Those guesses that came to rest, shape (M,), M <= N.
    """
    z = starts.astype(np.complex128)
    resting = np.zeros(z.size, dtype=bool)
    last_step, stalls = np.full(z.size, np.inf), np.zeros(z.size, dtype=np.int64)
    for _ in range(ABERTH_ROUNDS):
        moving = np.flatnonzero(~resting & np.isfinite(z))
        if moving.size == 0:
            break
        value, slope = function(z[moving])
        with np.errstate(divide="ignore", invalid="ignore"):
            newton = value / slope
            step = newton / (1.0 - newton * _pull(z, moving, fixed))
        step[value == 0.0] = 0.0
        z[moving] -= step
        size, scale = np.abs(step), np.abs(z[moving])
        stalls[moving] += (size <= NOISE * scale) & (size >= 0.5 * last_step[moving])
        resting[moving] = (size <= ROUNDING * scale) | (stalls[moving] >= STALLS)
        last_step[moving] = size
        z[~resting & ~within.holds(z)] = np.nan
    return z[resting & np.isfinite(z)]


def _pull(z: ComplexArray, moving: NDArray[np.int64], fixed: ComplexArray) -> ComplexArray:
    """Sum of 1 / (distance) to the other guesses and to the fixed zeros."""
    distance = z[moving, None] - z[None, :]
    distance[np.isnan(distance) | (distance == 0.0)] = np.inf  # itself, and the given-up ones
    pull: ComplexArray = (1.0 / distance).sum(axis=1)
    if fixed.size:
        away = z[moving, None] - fixed[None, :]
        away[away == 0.0] = np.inf
        pull = pull + (1.0 / away).sum(axis=1)
    return pull


def distinct(points: ComplexArray) -> ComplexArray:
    """Sort by real part and drop repetitions, to within rounding."""
    kept: list[complex] = []
    for point in points[np.lexsort((points.imag, points.real))]:
        tolerance = 4.0 * ROUNDING * max(abs(point), 1e-3)
        if all(abs(point - other) > tolerance for other in kept[-8:]):
            kept.append(complex(point))
    return np.array(kept, dtype=np.complex128)


def walk(
    function: Function, box: Rectangle, known: ComplexArray, most_points: int = MOST_POINTS
) -> Contour:
    """Go round a rectangle counterclockwise, refining until every step is resolved."""
    corners = [
        complex(box.left, box.bottom),
        complex(box.right, box.bottom),
        complex(box.right, box.top),
        complex(box.left, box.top),
    ]
    share = np.arange(FIRST_STEPS) / FIRST_STEPS
    point = np.concatenate(
        [corners[i] * (1.0 - share) + corners[(i + 1) % 4] * share for i in range(4)]
    )
    phase, slope = _deflated(function, point, known)
    for _ in range(REFINEMENTS):
        if not np.isfinite(slope).all() or point.size > most_points:
            break
        step = np.append(point[1:], point[0]) - point
        log_step, coarse = _steps(step, phase, slope)
        if not coarse.any():
            return Contour(point, slope, log_step, resolved=True)
        at = np.flatnonzero(coarse)
        middle = point[at] + 0.5 * step[at]
        new_phase, new_slope = _deflated(function, middle, known)
        point = np.insert(point, at + 1, middle)
        phase = np.insert(phase, at + 1, new_phase)
        slope = np.insert(slope, at + 1, new_slope)
    return Contour(point, slope, np.zeros_like(point), resolved=False)


def _deflated(
    function: Function, point: ComplexArray, known: ComplexArray
) -> tuple[ComplexArray, ComplexArray]:
    """Phase factor and logarithmic derivative, the known zeros divided out; inf where lost."""
    value, slope = function(point)
    with np.errstate(divide="ignore", invalid="ignore"):
        away = point[:, None] - known[None, :]
        turn = np.exp(1j * np.angle(value)) * np.exp(-1j * np.angle(away).sum(axis=1))
        log_slope = slope / value - (1.0 / away).sum(axis=1)
        return turn, np.where(np.abs(value) < LOST, np.inf, log_slope)


def _steps(
    step: ComplexArray, phase: ComplexArray, slope: ComplexArray
) -> tuple[ComplexArray, NDArray[np.bool_]]:
    """Change of phase along each step, and which steps are too long to be trusted."""
    after = np.append(slope[1:], slope[0])
    turned = np.angle(np.append(phase[1:], phase[0]) / phase)
    predicted = 0.5 * (slope + after) * step
    size = np.maximum(np.abs(slope), np.abs(after)) * np.abs(step)
    agree = (np.abs(predicted.imag - turned) <= AGREEMENT) & (size <= STEP_LIMIT)
    return predicted.real + 1j * turned, ~agree


def winding(contour: Contour) -> int:
    """Count the zeros inside a resolved contour."""
    return round(float(contour.log_step.imag.sum()) / (2.0 * np.pi))


def from_moments(contour: Contour, number: int) -> ComplexArray:
    """Guesses for a few zeros from the moments of the logarithmic derivative.

    The power sums s_p = (1 / 2 pi i) integral z^p f'/f dz give, by Newton's identities, the
    polynomial whose zeros they are.
    """
    centre = contour.point.mean()
    z = contour.point - centre
    after = np.append(z[1:], z[0])
    middle = 0.5 * (z + after)
    sums = [(middle**p * contour.log_step).sum() / (2j * np.pi) for p in range(1, number + 1)]
    elementary = [1.0 + 0.0j]
    for n in range(1, number + 1):
        terms = [(-1) ** (k - 1) * elementary[n - k] * sums[k - 1] for k in range(1, n + 1)]
        elementary.append(sum(terms) / n)
    polynomial = [(-1) ** k * e for k, e in enumerate(elementary)]
    guesses: ComplexArray = np.roots(np.array(polynomial)) + centre
    return guesses
