"""The Frobenius series of one sector, summed over position with the energy kept as a variable.

G. Frobenius, J. reine angew. Math. 76, 214 (1873), from memory; its use stands in `sectors`.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C_EV_NM2

FloatArray = NDArray[np.float64]

SERIES_TERMS = 24
"""1.5**24 / 24! = 3e-20: the first term left out lies below the rounding of the first one."""
DEGREE = SERIES_TERMS // 2
"""Two powers of position bring at most one power of energy."""


def sector_series(
    length: FloatArray,
    edge: FloatArray,
    edge_rise: FloatArray,
    mass: FloatArray,
    mass_rise: FloatArray,
    *,
    reach: float | FloatArray,
    stops: FloatArray,
) -> FloatArray:
    """Sum the series of sectors with linear edge and mass.

    With s the fraction of the sector and e the scaled energy, order k + 1 of psi and f follows
    from orders k and k - 1::

        (k+1) psi[k+1] = (h/c) (m0 f[k] + m1 f[k-1])
        (k+1) f[k+1]   = h ((V0 - reach e) psi[k] + V1 psi[k-1])

    Parameters
    ----------
    length, edge, edge_rise, mass, mass_rise : ndarray, shape (S,)
        Length in nm, edge at the left face above the expansion's centre and its rise across the
        sector in eV, mass at the left face and its rise in m0.
    reach : float, or ndarray of shape (S, 1)
        Energy in eV that the expansion variable is scaled by.
    stops : ndarray, shape (P,)
        Fractions of the length at which the matrices are wanted.

    Returns
    -------
    ndarray, shape (P, 4, S, DEGREE + 1)
        Stop, matrix element (a, b, c, d), sector, power of the scaled energy.
    """
    h = length[:, None]
    v0, v1 = h * edge[:, None], h * edge_rise[:, None]
    m0, m1 = h * mass[:, None] / C_EV_NM2, h * mass_rise[:, None] / C_EV_NM2
    size = (2, length.size, DEGREE + 1)  # the two fundamental solutions
    psi, flux = np.zeros(size), np.zeros(size)
    psi[0, :, 0], flux[1, :, 0] = 1.0, 1.0
    psi_before, flux_before = np.zeros(size), np.zeros(size)
    orders = np.empty((SERIES_TERMS + 1, 4, length.size, DEGREE + 1))
    orders[0, :2], orders[0, 2:] = psi, flux
    for k in range(SERIES_TERMS):
        psi_next = (m0 * flux + m1 * flux_before) / (k + 1)
        flux_next = v0 * psi + v1 * psi_before
        flux_next[..., 1:] -= reach * h * psi[..., :-1]
        flux_next /= k + 1
        psi_before, flux_before, psi, flux = psi, flux, psi_next, flux_next
        orders[k + 1, :2], orders[k + 1, 2:] = psi, flux
    powers = stops[:, None] ** np.arange(SERIES_TERMS + 1)
    total: FloatArray = np.tensordot(powers, orders, axes=(1, 0))
    return total
