"""How electrons fill a parabolic band: Fermi-Dirac integral, Fermi energy, density.

The integral of order 1/2,::

    F(eta) = integral_0^inf sqrt(t) / (1 + exp(t - eta)) dt,

becomes with t = u^2 that of an even, analytic function over the whole line, for which the
trapezoidal rule of step h errs only by exp(-2 pi Im(u) / h) for each pole u, and by
2 exp(-(pi / h)^2) for the Gaussian decay (L. N. Trefethen and J. A. C. Weideman, SIAM Rev. 56, 385
(2014)). The poles u_n = sqrt(eta + i pi (2 n + 1)) come close to the line where eta is large; what
they contribute is known exactly and taken off. From `SOMMERFELD_FROM` on the asymptotic series of
A. Sommerfeld, Z. Phys. 47, 1 (1928), is at rounding. There is no factor 1/Gamma(3/2) in F.

Accuracy: 1e-13 relative from eta = -700 to beyond 1e6. Below -708 F underflows towards 0.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from physics.constants import (
    BOLTZMANN_EV_PER_K,
    BOLTZMANN_J_PER_K,
    ELECTRON_MASS_KG,
    PLANCK_J_S,
)
from physics.errors import ConvergenceError, StructureError
from physics.ranges import CONTACT_DONORS_CM3, MASS, TEMPERATURE_K, Range

FloatArray = NDArray[np.float64]

STEP = 0.25
"""Step in u; the Gaussian decay then errs by exp(-158)."""
NODES = STEP * np.arange(1, 41)
"""Nodes u > 0, to u^2 = 100: 60 above the largest eta that the rule serves."""
FAR_POLE = 2.0
"""Im(u) beyond which a pole contributes less than exp(-50) and is left out."""
POLES = np.arange(5)
"""Poles looked at; the fifth lies beyond `FAR_POLE` for every eta that the rule serves."""
SOMMERFELD_FROM = 40.0
"""eta from which twelve terms of the series reach 1e-17."""
SOMMERFELD_TERMS = 12

BOLTZMANN_BELOW = 1e-20
"""Filling n / Nc below which F is exp(eta) sqrt(pi) / 2 to rounding, and may underflow."""
MAX_NEWTON_STEPS = 60
NEWTON_TOLERANCE = 1e-8
"""Relative step after which the next one, quadratically smaller, is below rounding."""


def fermi_dirac_half(eta: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Fermi-Dirac integral of order 1/2 and its derivative.

    Parameters
    ----------
    eta : array_like
        Fermi energy above the band edge over kT, finite; any shape.

    Returns
    -------
    value, slope : ndarray
        F and dF/deta, of the shape of ``eta``.
    """
    argument = np.asarray(eta, dtype=np.float64)
    flat = argument.reshape(-1)
    value, slope = np.empty_like(flat), np.empty_like(flat)
    large = flat >= SOMMERFELD_FROM
    value[large], slope[large] = _sommerfeld(flat[large])
    value[~large], slope[~large] = _trapezoidal(flat[~large])
    return value.reshape(argument.shape), slope.reshape(argument.shape)


def _trapezoidal(eta: FloatArray) -> tuple[FloatArray, FloatArray]:
    # Below eta = 0, exp(eta) is taken out of the sum, which keeps the tail's relative accuracy.
    factor = np.exp(np.minimum(eta, 0.0))  # (E,)
    square = NODES**2  # (N,)
    above = square - np.maximum(eta, 0.0)[:, None]  # (E, N)
    decay = np.exp(np.minimum(eta, 0.0))[:, None] * np.exp(-above)  # exp(eta - u^2)
    filled = np.exp(-above) / (1.0 + decay)  # occupation over the factor
    sums = 2.0 * STEP * np.sum(square * filled, axis=1)
    slopes = 2.0 * STEP * np.sum(square * filled / (1.0 + decay), axis=1)
    excess, excess_slope = _pole_excess(eta)
    return factor * sums - excess, factor * slopes - excess_slope


def _pole_excess(eta: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Excess of the trapezoidal rule due to the near poles, and its derivative; each (E,)."""
    pole = np.sqrt(eta[:, None] + 1j * math.pi * (2 * POLES + 1))  # (E, P)
    near = pole.imag < FAR_POLE
    q = np.exp(2j * math.pi / STEP * pole)  # |q| < 1
    kernel = q / (q - 1.0)  # 1 / (1 - 1/q)
    kernel_slope = -2j * math.pi / STEP * q / (q - 1.0) ** 2
    excess = -4.0 * math.pi * (pole * kernel).imag
    # d(pole)/d(eta) = 1 / (2 pole)
    excess_slope = -4.0 * math.pi * ((kernel + pole * kernel_slope) / (2.0 * pole)).imag
    return np.sum(excess * near, axis=1), np.sum(excess_slope * near, axis=1)


def _sommerfeld(eta: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Sum 2/3 eta^(3/2) + sum_k 2 eta_D(2k) d^(2k-1)/d eta^(2k-1) sqrt(eta), and its derivative."""
    value = np.full_like(eta, 2.0 / 3.0)
    slope = np.ones_like(eta)
    inverse = 1.0 / eta
    power = np.ones_like(eta)
    for k, coefficient in enumerate(_SOMMERFELD, start=1):
        power = power * inverse * inverse
        value += coefficient * power
        slope += coefficient * (1.5 - 2 * k) * power
    root = np.sqrt(eta)
    return value * eta * root, slope * root


def _sommerfeld_coefficients() -> tuple[float, ...]:
    """2 eta_D(2k) (1/2) (-1/2) ... (1/2 - 2k + 2), with Dirichlet's eta_D(s) = sum -(-1)^n n^-s."""
    coefficients = []
    derivative = 0.5
    for k in range(1, SOMMERFELD_TERMS + 1):
        coefficients.append(2.0 * _alternating_zeta(2 * k) * derivative)
        derivative *= (0.5 - (2 * k - 1)) * (0.5 - 2 * k)
    return tuple(coefficients)


def _alternating_zeta(order: int) -> float:
    """1 - 2^-s + 3^-s - ...; closed forms (Dirichlet) where the sum itself is slow."""
    closed = {2: 1 / 12, 4: 7 / 720, 6: 31 / 30240, 8: 127 / 1209600}
    if order in closed:
        return closed[order] * math.pi**order
    return math.fsum((-1) ** (n - 1) * float(n) ** -order for n in range(1, 61))


_SOMMERFELD = _sommerfeld_coefficients()


def band_density_cm3(mass: float, temperature_K: float) -> float:
    """Effective density of states 2 (2 pi m kT / h^2)^(3/2) of a parabolic band, in cm^-3.

    S. M. Sze, Physics of Semiconductor Devices, 2nd ed. (1981), sec. 1.4, from memory.

    Raises
    ------
    StructureError
        A mass or temperature outside its range.
    """
    _require("mass", mass, MASS)
    _require("temperature_K", temperature_K, TEMPERATURE_K)
    thermal = 2.0 * math.pi * mass * ELECTRON_MASS_KG * BOLTZMANN_J_PER_K * temperature_K
    return 2.0 * (math.sqrt(thermal) / PLANCK_J_S) ** 3 * 1e-6


def donors_from_fermi(fermi_eV: float, mass: float, temperature_K: float) -> float:
    """Electron density, hence ionised donors of a neutral contact, from its Fermi energy.

    Parameters
    ----------
    fermi_eV : float
        Fermi energy from the band edge.
    mass : float
        In m0.
    temperature_K : float
        0.01 to 2000 K.

    Returns
    -------
    float
        In cm^-3; 0 where the Fermi energy lies so far below the edge that the number underflows.

    Raises
    ------
    StructureError
        A value outside its range.
    """
    density = band_density_cm3(mass, temperature_K)
    if not math.isfinite(fermi_eV):
        raise StructureError("contact", "fermi_eV", fermi_eV, "a Fermi energy is a finite number")
    value, _ = fermi_dirac_half(fermi_eV / (BOLTZMANN_EV_PER_K * temperature_K))
    return density * 2.0 / math.sqrt(math.pi) * float(value)


def fermi_from_donors(donors_cm3: float, mass: float, temperature_K: float) -> float:
    """Fermi energy of a neutral, parabolic band whose donors are all ionised.

    Solves n = Nc 2/sqrt(pi) F(eta) for eta by Newton's method on ln F, which is concave, so that
    the iteration converges from any start.

    Parameters
    ----------
    donors_cm3 : float
        Ionised donors, above 0 and at most 1e22 cm^-3.
    mass : float
        In m0.
    temperature_K : float
        0.01 to 2000 K.

    Returns
    -------
    float
        Fermi energy in eV from the band edge; negative where the band is barely filled.

    Raises
    ------
    StructureError
        A value outside its range.
    ConvergenceError
        The iteration did not settle.
    """
    density = band_density_cm3(mass, temperature_K)
    _require("donors_cm3", donors_cm3, CONTACT_DONORS_CM3)
    if donors_cm3 < BOLTZMANN_BELOW * density:
        eta = math.log(donors_cm3) - math.log(density)
    else:
        eta = _reduced_fermi(donors_cm3 / density * (0.5 * math.sqrt(math.pi)))
    return eta * BOLTZMANN_EV_PER_K * temperature_K


def _reduced_fermi(target: float) -> float:
    """Solve F(eta) = target, from the nearer of the two limits."""
    if target < 1.0:
        eta = math.log(target / (0.5 * math.sqrt(math.pi)))
    else:
        eta = (1.5 * target) ** (2.0 / 3.0)
    for _ in range(MAX_NEWTON_STEPS):
        value, slope = (float(part) for part in fermi_dirac_half(eta))
        step = value / slope * math.log1p((target - value) / value)
        eta += step
        if abs(step) <= NEWTON_TOLERANCE * max(1.0, abs(eta)):
            return eta
    raise ConvergenceError(f"no Fermi energy found for F(eta) = {target:g}; last eta was {eta:g}")


def _require(key: str, value: float, allowed: Range) -> None:
    if not allowed.holds(value):
        raise StructureError("contact", key, value, allowed.allowed)
