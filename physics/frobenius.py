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
TWO_BAND_DEGREE = 22
"""With a mass that goes with the energy each power of position brings one of energy; the first term
left out is 1.5**23 / 23! = 4e-19."""


def sector_series(
    described: FloatArray, *, degree: int, reach: float | FloatArray, stops: FloatArray
) -> FloatArray:
    """Sum the series of sectors with linear edge, mass and mass slope.

    With s the fraction of the sector and e the scaled energy, order k + 1 of psi and f follows
    from orders k and k - 1::

        (k+1) psi[k+1] = (h/c) (m0 f[k] + m1 f[k-1])
        (k+1) f[k+1]   = h ((V0 - reach e) psi[k] + V1 psi[k-1])

    A mass slope ``b0 + b1 s`` turns m0 into ``m0 - b0 V0 + b0 reach e``, m1 into
    ``m1 - b1 V0 - b0 V1 + b1 reach e``, and adds ``-b1 V1 f[k-2]``.

    Parameters
    ----------
    described : ndarray, shape (S, 7)
        Length in nm, edge at the left face above the expansion's centre and its rise across the
        sector in eV, mass at the left face and its rise in m0, mass slope there and its rise in m0
        per eV.
    degree : int
        DEGREE where all mass slopes are 0, else TWO_BAND_DEGREE.
    reach : float, or ndarray of shape (S, 1)
        Energy in eV that the expansion variable is scaled by.
    stops : ndarray, shape (P,)
        Fractions of the length at which the matrices are wanted.

    Returns
    -------
    ndarray, shape (P, 4, S, degree + 1)
        Stop, matrix element (a, b, c, d), sector, power of the scaled energy.
    """
    h, edge, edge_rise, mass, mass_rise, slope, slope_rise = described.T[..., None]
    v0, v1 = h * edge, h * edge_rise
    m0, m1 = h * mass / C_EV_NM2, h * mass_rise / C_EV_NM2
    b0, b1 = slope / C_EV_NM2, slope_rise / C_EV_NM2
    m0, m1, m2 = m0 - b0 * v0, m1 - b1 * v0 - b0 * v1, -b1 * v1
    e0, e1 = reach * h * b0, reach * h * b1
    size = (2, described.shape[0], degree + 1)  # the two fundamental solutions
    psi, flux = np.zeros(size), np.zeros(size)
    psi[0, :, 0], flux[1, :, 0] = 1.0, 1.0
    psi_before, flux_before, flux_older = np.zeros(size), np.zeros(size), np.zeros(size)
    orders = np.empty((SERIES_TERMS + 1, 4, described.shape[0], degree + 1))
    orders[0, :2], orders[0, 2:] = psi, flux
    for k in range(SERIES_TERMS):
        psi_next = m0 * flux + m1 * flux_before
        if degree > DEGREE:
            psi_next += m2 * flux_older
            psi_next[..., 1:] += e0 * flux[..., :-1] + e1 * flux_before[..., :-1]
            flux_older = flux_before
        psi_next /= k + 1
        flux_next = v0 * psi + v1 * psi_before
        flux_next[..., 1:] -= reach * h * psi[..., :-1]
        flux_next /= k + 1
        psi_before, flux_before, psi, flux = psi, flux, psi_next, flux_next
        orders[k + 1, :2], orders[k + 1, 2:] = psi, flux
    powers = stops[:, None] ** np.arange(SERIES_TERMS + 1)
    total: FloatArray = np.tensordot(powers, orders, axes=(1, 0))
    return total
