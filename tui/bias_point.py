"""What is read off a current curve at the bias in hand: computed there, not between its points."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from physics.curve import Curve, Drive, curve_at, slopes

APART_V = 2e-4
"""Steps between the five biases that give the slope: far below a level's or kT's share of a curve,
far above what the error of a current makes of them."""
REACH_V = 2.0 * APART_V


@dataclass(frozen=True)
class BiasPoint:
    """Current, slope and levels at one bias."""

    bias_V: float
    current_density_A_per_cm2: float
    error_A_per_cm2: float
    conductance_S_per_cm2: float
    level_eV: tuple[float, ...]
    level_share: tuple[float, ...]
    """Shares of the current, in the order of the levels."""
    is_exact: bool = True
    """False where it was read off between the points of a curve."""


def point_at(drive: Drive, bias_V: float) -> BiasPoint:
    """Compute what is at a bias; the drive has to hold for biases `REACH_V` around it."""
    curve = curve_at(drive, bias_V + APART_V * np.arange(-2.0, 3.0))
    slope = slopes(curve.bias_V, curve.current_density_A_per_cm2)
    return _point(curve, 2, bias_V, float(slope[2]), is_exact=True)


def point_between(curve: Curve, bias_V: float) -> BiasPoint:
    """Read off between the points of a curve, until the point itself is computed."""
    nearest = int(np.argmin(np.abs(curve.bias_V - bias_V)))
    slope = float(np.interp(bias_V, curve.bias_V, curve.conductance_S_per_cm2))
    near = _point(curve, nearest, bias_V, slope, is_exact=False)
    here = float(np.interp(bias_V, curve.bias_V, curve.current_density_A_per_cm2))
    return BiasPoint(bias_V, here, 0.0, slope, near.level_eV, near.level_share, is_exact=False)


def _point(curve: Curve, n: int, bias_V: float, slope: float, *, is_exact: bool) -> BiasPoint:
    current = float(curve.current_density_A_per_cm2[n])
    real = np.isfinite(curve.level_eV[n])
    shares = curve.level_current_A_per_cm2[n][real] / (current or np.inf)
    return BiasPoint(
        bias_V,
        current,
        float(curve.error_A_per_cm2[n]),
        slope,
        tuple(curve.level_eV[n][real].tolist()),
        tuple(shares.tolist()),
        is_exact,
    )
