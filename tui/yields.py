"""Yields and spreads from draws, with the interval that they are known within.

The draws are several independent scramblings of one low-discrepancy sequence (I. M. Sobol', USSR
Comput. Math. Math. Phys. 7, 86 (1967); A. B. Owen, J. Complexity 14, 466 (1998); from memory).
Their scatter says how well the yield is known, without a model of the draws' dependence: Student's
t on the scramblings' yields. Where they all agree, none or all of the draws pass and the scatter
says nothing: then Wilson's interval for independent draws stands in (E. B. Wilson, J. Am. Stat.
Assoc. 22, 209 (1927), from memory), which is wider than these draws deserve.
"""

from __future__ import annotations

import math
import warnings
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

SCRAMBLINGS = 8
STUDENT_T = 2.3646
"""97.5 % point of Student's t with `SCRAMBLINGS` - 1 degrees of freedom."""
NORMAL_Z = 1.95996
"""97.5 % point of the normal distribution."""
HALF_CELL = 2.0**-31
"""Half the distance between coordinates of 30 bits: no point lies at 0, whose normal is -inf."""


@dataclass(frozen=True)
class Yield:
    """A share of draws, with intervals of 95 %."""

    value: float
    low: float
    high: float
    """By the scramblings' scatter."""
    wilson_low: float
    wilson_high: float
    """As if the draws were independent."""


@dataclass(frozen=True)
class Spread:
    """How one result comes out; nan where no draw has it."""

    mean: float
    sd: float
    p05: float
    p50: float
    p95: float
    absent: int
    """Draws that do not have it."""


def normal_draws(dimensions: int, count: int, seed: int) -> FloatArray:
    """Draw standard normal values.

    Parameters
    ----------
    count : int
        Number of draws, a multiple of `SCRAMBLINGS`; a power of 2 as well is best.

    Returns
    -------
    ndarray, shape (count, dimensions)
        Draw n is of scrambling n modulo `SCRAMBLINGS`.
    """
    from scipy.special import ndtri
    from scipy.stats import qmc

    each = count // SCRAMBLINGS
    parts = []
    for number in range(SCRAMBLINGS):
        random = np.random.default_rng([seed, number])
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", DeprecationWarning)  # seed has got another name
            points = qmc.Sobol(dimensions, scramble=True, seed=random)
        parts.append(points.random_base2(max(each - 1, 0).bit_length())[:each])
    unit = np.stack(parts, axis=1).reshape(count, dimensions)
    normal: FloatArray = ndtri(np.clip(unit, HALF_CELL, 1.0 - HALF_CELL))
    return normal


def yield_of(passed: BoolArray) -> Yield:
    """Give the share of draws (N,) that passed; N is a multiple of `SCRAMBLINGS`."""
    each = passed.reshape(-1, SCRAMBLINGS).mean(axis=0)
    value = float(each.mean())
    wilson = wilson_interval(int(passed.sum()), passed.size)
    reach = STUDENT_T * float(each.std(ddof=1)) / math.sqrt(SCRAMBLINGS)
    if reach == 0.0 and value in (0.0, 1.0):
        return Yield(value, *wilson, *wilson)
    return Yield(value, max(value - reach, 0.0), min(value + reach, 1.0), *wilson)


def gain_of(passed: BoolArray, before: BoolArray) -> tuple[float, float, float]:
    """Give what the yield gains, and the interval by the scramblings' scatter."""
    more = passed.reshape(-1, SCRAMBLINGS).mean(axis=0)
    each = more - before.reshape(-1, SCRAMBLINGS).mean(axis=0)
    value = float(each.mean())
    reach = STUDENT_T * float(each.std(ddof=1)) / math.sqrt(SCRAMBLINGS)
    return value, value - reach, value + reach


def wilson_interval(passed: int, count: int) -> tuple[float, float]:
    """Give Wilson's 95 % interval for independent draws."""
    share, weight = passed / count, NORMAL_Z**2 / count
    middle = (share + 0.5 * weight) / (1.0 + weight)
    half = math.sqrt(share * (1.0 - share) * weight + 0.25 * weight**2) / (1.0 + weight)
    return max(middle - half, 0.0), min(middle + half, 1.0)


def spread_of(values: FloatArray) -> Spread:
    """Describe values (N,), of which some may be nan or infinite."""
    there = values[np.isfinite(values)]
    absent = values.size - there.size
    if there.size == 0:
        return Spread(*(math.nan,) * 5, absent)
    low, middle, high = (float(p) for p in np.percentile(there, [5.0, 50.0, 95.0]))
    sd = float(there.std(ddof=1)) if there.size > 1 else math.nan
    return Spread(float(there.mean()), sd, low, middle, high, absent)


def passes(values: FloatArray, at_least: FloatArray, at_most: FloatArray) -> BoolArray:
    """Say which values (N, M) keep to their bounds (M,); nan does not."""
    kept: BoolArray = (values >= at_least) & (values <= at_most)
    return kept


def all_pass(values: FloatArray, at_least: FloatArray, at_most: FloatArray) -> BoolArray:
    """Say which draws keep to all bounds, shape (N,); see `passes`."""
    kept: BoolArray = np.all(passes(values, at_least, at_most), axis=1)
    return kept
