"""Spreads and yields that a linear model predicts, at once and before any draw is computed."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.growth_errors import SOURCES
from tui.chance import Plan, Slopes
from tui.yields import SCRAMBLINGS, all_pass, passes

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

LINEAR_DRAWS = 16_384
"""Draws of the linear model, which cost nothing."""


@dataclass(frozen=True, eq=False)
class Linear:
    """The linear estimate; for gradings, whose width counts by its square, the square as well."""

    slopes: Slopes
    sd: FloatArray
    """Of each result, shape (M,)."""
    share: FloatArray
    """Share of each result's variance that each source has, shape (M, S)."""
    yields: tuple[float | None, ...]
    """By specification; None for a result without one."""
    joint: float | None


def sources_of(plan: Plan) -> list[str]:
    """Give the sources that act on the design."""
    there = {variable.source for variable in plan.errors.variables}
    return [source for source in SOURCES if source in there]


def of_source(plan: Plan, source: str) -> BoolArray:
    """Say which variables are of a source, shape (K,)."""
    return np.array([variable.source == source for variable in plan.errors.variables])


def bounds(plan: Plan) -> tuple[FloatArray, FloatArray]:
    """Lower and upper bound of each result, each of shape (M,), infinite where there is none."""
    specs = plan.session.specs
    low = [-math.inf if spec.at_least is None else spec.at_least for spec in specs]
    high = [math.inf if spec.at_most is None else spec.at_most for spec in specs]
    return np.array(low), np.array(high)


def linear_estimate(plan: Plan, slopes: Slopes, seed: int) -> Linear:
    """Predict spreads and yields from a linear model; see `Linear`."""
    variance = slopes.slope**2 + 2.0 * slopes.bend**2  # of z^2, the variance is 2
    total = variance.sum(axis=1)
    parts = [variance[:, of_source(plan, s)].sum(axis=1) for s in sources_of(plan)]
    share = np.stack(parts, axis=1) / np.where(total > 0.0, total, np.nan)[:, None]
    count = slopes.value.size
    if not plan.session.specs:
        return Linear(slopes, np.sqrt(total), share, (None,) * count, None)
    if not np.isfinite(total).all():
        return Linear(slopes, np.sqrt(total), share, (None,) * count, None)
    random = np.random.default_rng([seed, SCRAMBLINGS])
    draws = random.standard_normal((LINEAR_DRAWS, slopes.slope.shape[1]))
    passed = passes(slopes.at(draws), *bounds(plan))
    each = tuple(float(share) for share in passed.mean(axis=0))
    return Linear(
        slopes, np.sqrt(total), share, each, float(all_pass(slopes.at(draws), *bounds(plan)).mean())
    )
