"""Zeros of functions whose zeros are known in closed form."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import scipy.special
from hypothesis import given, settings
from hypothesis import strategies as st

from physics.rootfinding import Rectangle, distinct, polish, walk, winding, zeros_in

BOX = Rectangle(-1.0, 1.0, -1.0, 1.0)
NONE = np.empty(0, dtype=np.complex128)


def with_zeros(*zeros: complex) -> Callable:
    """A polynomial with given zeros times exp(3 z), which has none."""
    polynomial = np.polynomial.Polynomial.fromroots(zeros)

    def function(z: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        value, slope = polynomial(z), polynomial.deriv()(z)
        return np.exp(3.0 * z) * value, np.exp(3.0 * z) * (slope + 3.0 * value)

    return function


def inside(zeros: np.ndarray) -> list[complex]:
    return sorted(zeros[BOX.holds(zeros)].tolist(), key=lambda z: (z.real, z.imag))


@pytest.mark.parametrize("starts", [NONE, np.array([0.3 + 0.0j]), np.array([0.9j, -0.7])])
def test_finds_all_from_any_start(starts: np.ndarray) -> None:
    zeros = (0.1 - 0.2j, -0.8 + 0.5j, 0.83 - 0.9j, 0.1 - 0.21j, 0.5 + 0j, 4.0 + 0j)
    found = zeros_in(with_zeros(*zeros), BOX, starts)
    assert found.proved
    assert found.counted == 5
    expected = sorted(zeros[:5], key=lambda z: (z.real, z.imag))
    assert inside(found.points) == pytest.approx(expected, abs=1e-12)


def test_close_pair_stays_two() -> None:
    zeros = (0.3 + 1e-9j, 0.3 + 1e-9j + 1e-8, -0.4 - 0.1j)
    found = zeros_in(with_zeros(*zeros), BOX, np.array([0.31 + 0j, 0.29 + 0j]))
    assert found.proved
    assert found.counted == 3


def test_empty_box() -> None:
    found = zeros_in(with_zeros(3.0 + 0j), BOX, NONE)
    assert (found.counted, found.proved) == (0, True)
    assert inside(found.points) == []


def test_known_zero_on_the_contour_does_no_harm() -> None:
    found = zeros_in(with_zeros(1.0 + 0.1j, 0.2 + 0j), BOX, np.array([0.99 + 0.1j, 0.1 + 0j]))
    assert found.proved


def test_unknown_zero_on_the_contour_is_not_proved_away() -> None:
    """The phase jumps at a zero on the path: no step there can be resolved."""
    contour = walk(with_zeros(1.0 + 0.1234567j), BOX, NONE)
    assert not contour.resolved


def test_zeros_of_the_sine() -> None:
    def sine(z: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        return np.sin(40.0 * z), 40.0 * np.cos(40.0 * z)

    box = Rectangle(0.001, 1.0, -0.2, 0.3)
    found = zeros_in(sine, box, NONE)
    expected = np.arange(1, 13) * np.pi / 40.0
    points = np.sort(found.points[box.holds(found.points)].real)
    assert found.proved
    assert points == pytest.approx(expected, abs=1e-14)


def test_zeros_of_the_airy_function() -> None:
    """Against scipy.special.ai_zeros."""

    def airy(z: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        value, slope, _, _ = scipy.special.airy(z)
        return value, slope

    box = Rectangle(-9.9, 0.0, -1.0, 1.0)
    found = zeros_in(airy, box, np.array([-2.0 + 0j]))
    expected = np.sort(scipy.special.ai_zeros(7)[0])
    expected = expected[expected > -9.9]
    assert found.proved
    assert np.sort(found.points[box.holds(found.points)].real) == pytest.approx(expected, abs=1e-9)


parts = st.floats(-0.97, 0.97)


@settings(max_examples=60, deadline=None)
@given(st.lists(st.builds(complex, parts, parts), min_size=1, max_size=9))
def test_winding_counts(zeros: list[complex]) -> None:
    contour = walk(with_zeros(*zeros), BOX, NONE)
    assert contour.resolved
    assert winding(contour) == len(zeros)


def test_polish_leaves_fixed_zeros_alone() -> None:
    function = with_zeros(0.2 + 0j, 0.6 + 0j)
    found = polish(function, np.array([0.45 + 0.01j]), np.array([0.2 + 0j]), BOX)
    assert found == pytest.approx([0.6 + 0j], abs=1e-13)


def test_distinct() -> None:
    points = np.array([0.5 + 0j, 0.5 + 1e-17j, 0.4 + 0j, 0.5 + 1e-9j])
    assert distinct(points).size == 3
