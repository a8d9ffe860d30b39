"""What the contacts supply: the electrons of both, integrated over the energies in the plane."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

LEVEL_KT = 1.0
"""Fermi energies nearer than this are subtracted before, not after, the logarithm is taken."""


def supply_eV(
    energy_eV: FloatArray, mu_left_eV: FloatArray, mu_right_eV: FloatArray, kT_eV: float
) -> FloatArray:
    """Return kT ln[(1 + exp((mu_L - E)/kT)) / (1 + exp((mu_R - E)/kT))], shapes broadcast.

    Exactly 0 for equal Fermi energies, odd under their exchange, and to full relative accuracy
    for nearly equal ones, at any temperature: R. Tsu and L. Esaki, Appl. Phys. Lett. 22, 562
    (1973), in the form ``ln(1 + f_R (exp(d) - 1))`` with d = (mu_L - mu_R)/kT and Fermi's f.
    """
    upper, lower = np.maximum(mu_left_eV, mu_right_eV), np.minimum(mu_left_eV, mu_right_eV)
    apart = (upper - lower) / kT_eV
    above, below = (upper - energy_eV) / kT_eV, (lower - energy_eV) / kT_eV
    near = np.minimum(apart, LEVEL_KT)
    filled = np.exp(-np.logaddexp(0.0, -below))
    close = np.log1p(np.expm1(near) * filled)
    far = np.logaddexp(0.0, above) - np.logaddexp(0.0, below)
    sign = np.where(mu_left_eV >= mu_right_eV, 1.0, -1.0)
    return sign * kT_eV * np.where(apart <= LEVEL_KT, close, far)
