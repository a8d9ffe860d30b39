"""The pair of rules and the substitutions, against integrals in closed form."""

import math
from itertools import pairwise

import numpy as np
import pytest

from physics.quadrature import EVEN, GAUSS, KRONROD, NODE, PEAK, ROOT, Panels, estimate, joined


def panel(kind: int, centre: float, scale: float, start: float, stop: float) -> Panels:
    one = np.array([0])
    return Panels(
        one, one, np.array([kind]), *(np.array([x]) for x in (centre, scale, start, stop))
    )


@pytest.mark.parametrize("power", range(24))
def test_kronrod_is_exact_to_degree_23(power: int) -> None:
    """Kronrod's extension of n = 7 is exact to 3 n + 2 (A. S. Kronrod, 1965; from memory)."""
    exact = 0.0 if power % 2 else 2.0 / (power + 1)
    assert float(KRONROD @ NODE**power) == pytest.approx(exact, abs=2e-15)


@pytest.mark.parametrize("power", range(14))
def test_gauss_is_exact_to_degree_13(power: int) -> None:
    """And is numpy's own rule of seven points."""
    exact = 0.0 if power % 2 else 2.0 / (power + 1)
    assert float(GAUSS @ NODE**power) == pytest.approx(exact, abs=2e-15)
    node, weight = np.polynomial.legendre.leggauss(7)
    assert NODE[1::2] == pytest.approx(node, abs=1e-15)
    assert GAUSS[1::2] == pytest.approx(weight, abs=1e-15)


@pytest.mark.parametrize("half_width", [1e-2, 1e-6, 1e-12, 1e-40])
def test_a_line_however_narrow(half_width: float) -> None:
    """Integral of 1 / (1 + (x/g)^2) from -a to a is 2 g atan(a/g)."""
    ends = np.linspace(-math.asinh(0.1 / half_width), math.asinh(0.1 / half_width), 120)
    panels = joined([panel(PEAK, 0.3, half_width, a, b) for a, b in pairwise(ends)])
    distance, dx = panels.nodes()
    integral, error = estimate(1.0 / (1.0 + (distance / half_width) ** 2), dx)
    exact = 2.0 * half_width * math.atan(0.1 / half_width)
    assert integral.sum() == pytest.approx(exact, rel=1e-12)
    assert error.sum() <= 1e-9 * exact


def test_a_root_at_its_threshold() -> None:
    """Integral of sqrt(x) exp(x) from 0 to 1, by mpmath."""
    mpmath = pytest.importorskip("mpmath")
    distance, dx = panel(ROOT, 0.0, 1.0, 0.0, 1.0).nodes()
    integral, error = estimate(np.sqrt(distance) * np.exp(distance), dx)
    exact = float(mpmath.quad(lambda x: mpmath.sqrt(x) * mpmath.exp(x), [0, 1]))
    assert integral[0] == pytest.approx(exact, rel=1e-14)
    assert error[0] < 1e-9


@pytest.mark.parametrize("steepness", [1.0, 3.0, 10.0, 30.0])
def test_the_error_is_never_understated(steepness: float) -> None:
    """Integral of 1 / (1 + (k x)^2) over one even panel that is too wide for it."""
    distance, dx = panel(EVEN, 0.0, 1.0, -1.0, 0.7).nodes()
    integral, error = estimate(1.0 / (1.0 + (steepness * distance) ** 2), dx)
    exact = (math.atan(steepness) + math.atan(0.7 * steepness)) / steepness
    assert abs(integral[0] - exact) <= error[0] + 1e-15


def test_halves_make_the_whole() -> None:
    whole = panel(PEAK, 0.1, 0.01, -2.0, 3.0)
    parts = whole.halved().halved()
    assert parts.count == 4
    assert set(parts.owner.tolist()) == {0}
    distance, dx = parts.nodes()
    total = estimate(np.cos(distance), dx)[0].sum()
    exact = math.sin(0.01 * math.sinh(3.0)) - math.sin(0.01 * math.sinh(-2.0))
    assert total == pytest.approx(exact, rel=1e-13)
