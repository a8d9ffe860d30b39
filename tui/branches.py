"""Levels of a current curve over bias, each under a sign of its own.

The numbers are those of `physics.tracks`, as in every table of a curve; from the tenth on they are
letters, so that a sign takes one cell.
"""

from __future__ import annotations

import string
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.curve import Curve
from physics.tracks import followed

FloatArray = NDArray[np.float64]

SIGNS = "123456789" + string.ascii_lowercase
NEAR_EV = 3e-3
"""A level is that of a branch within this, and within what the bias between them moves it."""


@dataclass(frozen=True, eq=False)
class Branch:
    """One level over bias; arrays of shape (B,)."""

    sign: str
    energy_eV: FloatArray
    """nan where the level is not there."""
    share: FloatArray
    """Share of the current that runs through it; 0 where it is not there."""


def branches_of(curve: Curve) -> tuple[Branch, ...]:
    """Follow the levels of a curve; of very many the first few dozen."""
    energy, current = followed(curve)
    total = curve.current_density_A_per_cm2[:, None]
    carried = np.where(np.isfinite(current), current, 0.0)
    share = np.divide(carried, total, out=np.zeros_like(carried), where=total != 0.0)
    return tuple(
        Branch(sign, energy[:, n], share[:, n]) for n, sign in enumerate(SIGNS[: energy.shape[1]])
    )


def sign_of(branches: tuple[Branch, ...], bias_V: FloatArray, at_V: float, energy_eV: float) -> str:
    """Give the sign of a level at a bias between those of a curve; empty where it has none."""
    nearest = int(np.argmin(np.abs(bias_V - at_V)))
    reach = NEAR_EV + abs(float(bias_V[nearest]) - at_V)
    gaps = [(abs(float(branch.energy_eV[nearest]) - energy_eV), branch.sign) for branch in branches]
    return min((gap for gap in gaps if gap[0] <= reach), default=(0.0, ""))[1]
