"""Tsu-Esaki current by plain Gauss rules on pieces that shrink towards the level, T by mpmath.

Shares no code with ``physics``: T from `many_digits`, the logarithms from mpmath, numpy's Gauss
nodes. The level's energy is mpmath's too, so that a line of 1e-12 eV is met in its middle.
"""

from __future__ import annotations

from itertools import pairwise

import mpmath as mp
import numpy as np

from reference.many_digits import Stack, pole, transmission

NODES, WEIGHTS = np.polynomial.legendre.leggauss(10)
WIDEST = 0.02
DECADE = 3.0


def prefactor(mass: float) -> mp.mpf:
    """e m e^2 / (2 pi^2 hbar^3) in A/cm^2 per eV^2, from the CODATA 2022 values."""
    h, e, m = mp.mpf("6.62607015e-34"), mp.mpf("1.602176634e-19"), mp.mpf("9.1093837139e-31")
    return e * m * mp.mpf(mass) * e**2 / (2 * mp.pi**2 * (h / (2 * mp.pi)) ** 3) / 10**4


def supply(energy: mp.mpf, mu_left: float, mu_right: float, kT: mp.mpf) -> mp.mpf:
    """kT ln of the ratio, as it stands in the paper."""
    left = mp.log1p(mp.exp((mp.mpf(mu_left) - energy) / kT))
    return kT * (left - mp.log1p(mp.exp((mp.mpf(mu_right) - energy) / kT)))


def current(
    stack: Stack,
    guesses: list[complex],
    mu: tuple[float, float],
    temperature: float,
    span: tuple[float, float],
) -> mp.mpf:
    """Current density in A/cm^2 between two energies.

    Parameters
    ----------
    guesses : list of complex
        Where to look for the levels' poles; the pieces shrink towards each.
    """
    kT = mp.mpf("1.380649e-23") / mp.mpf("1.602176634e-19") * mp.mpf(temperature)
    total = mp.mpf(0)
    for start, stop in _pieces([pole(stack, guess) for guess in guesses], mu, kT, span):
        half = (stop - start) / 2
        for node, weight in zip(NODES.tolist(), WEIGHTS.tolist(), strict=True):
            energy = start + half * (1 + mp.mpf(node))
            through, _ = transmission(stack, energy)
            total += half * mp.mpf(weight) * through * supply(energy, *mu, kT)
    return prefactor(float(stack.left[1])) * total


def _pieces(
    poles: list[mp.mpc], mu: tuple[float, float], kT: mp.mpf, span: tuple[float, float]
) -> list[tuple[mp.mpf, mp.mpf]]:
    low, high = (mp.mpf(end) for end in span)
    ends = {low, high}
    ends |= {low + (high - low) * mp.mpf(2) ** -n for n in range(1, 24)}  # the edge's root
    for level in poles:
        width = -2 * level.imag
        ends.add(level.real)
        distance = width / 2
        while distance < high - low:
            ends |= {level.real - distance, level.real + distance}
            distance *= DECADE
    for fermi in mu:
        ends |= {mp.mpf(fermi) + kT * n for n in (-30, -15, -8, -4, -2, 0, 2, 4, 8, 15, 30, 50)}
    inside = sorted(end for end in ends if low <= end <= high)
    pieces = []
    for start, stop in pairwise(inside):
        number = max(1, int(mp.ceil((stop - start) / WIDEST)))
        step = (stop - start) / number
        pieces += [(start + n * step, start + (n + 1) * step) for n in range(number)]
    return pieces
