"""The grid that follows a curve, its slope, and the features off the grid."""

from dataclasses import replace

import numpy as np
import pytest

from physics.curve import (
    FIRST_POINTS,
    Curve,
    Drive,
    curve_at,
    joined_curves,
    own_curve,
    slopes,
    slopes_at,
)
from physics.extremes import main_region, regions
from physics.field import uniform_field
from physics.structure import Contact, Structure
from reference.stacks import stack, two_barriers


def drive(structure: Structure, fermi_eV: float = 0.04, temperature_K: float = 300.0) -> Drive:
    ends = (
        Contact(side.edge_eV, side.mass, fermi_eV) for side in (structure.left, structure.right)
    )
    filled = Structure(next(ends), structure.layers, next(ends))
    return Drive(
        filled,
        temperature_K,
        lambda biases: [uniform_field(filled, bias) for bias in biases.tolist()],
    )


@pytest.mark.parametrize("degree", range(5))
def test_slope_is_exact_for_polynomials_of_degree_four(degree: int) -> None:
    x = np.sort(np.random.default_rng(3).uniform(-1.0, 1.0, 17))
    exact = degree * x ** max(degree - 1, 0)
    assert slopes(x, x**degree) == pytest.approx(exact, abs=1e-9)


def test_slope_of_few_points() -> None:
    assert slopes(np.array([0.0, 2.0]), np.array([1.0, 5.0])) == pytest.approx([2.0, 2.0])
    assert np.isnan(slopes(np.array([1.0]), np.array([1.0]))).all()


@pytest.fixture(scope="module")
def diode() -> tuple[Drive, Curve]:
    there = drive(two_barriers(3.0, 5.0, 3.0))
    return there, own_curve(there, 0.0, 0.4)


def test_the_grid_follows_the_curve(diode: tuple[Drive, Curve]) -> None:
    """Between its points the curve departs little from what a straight line gives."""
    there, curve = diode
    assert curve.bias_V.size > FIRST_POINTS
    middle = 0.5 * (curve.bias_V[1:] + curve.bias_V[:-1])
    exact = curve_at(there, middle).current_density_A_per_cm2
    straight = 0.5 * (curve.current_density_A_per_cm2[1:] + curve.current_density_A_per_cm2[:-1])
    size = np.maximum(np.median(exact), 0.25 * exact)
    assert np.abs(exact - straight).max() < 0.02 * size.max()
    assert np.quantile(np.abs(exact - straight) / size, 0.9) < 0.01


def test_slope_against_close_differences(diode: tuple[Drive, Curve]) -> None:
    """Central differences over 0.1 mV, of fourth order."""
    there, curve = diode
    inner = slice(5, -5, 7)
    at, step = curve.bias_V[inner], 1e-4
    values = [
        curve_at(there, at + n * step).current_density_A_per_cm2 for n in (-2.0, -1.0, 1.0, 2.0)
    ]
    exact = (8.0 * (values[2] - values[1]) - (values[3] - values[0])) / (12.0 * step)
    size = np.abs(curve.conductance_S_per_cm2).max()
    assert curve.conductance_S_per_cm2[inner] == pytest.approx(exact, abs=0.01 * size)


def test_close_slopes_of_a_coarse_curve(diode: tuple[Drive, Curve]) -> None:
    """The fine curve's own slopes, also at both ends."""
    there, fine = diode
    coarse = curve_at(there, np.array([0.0, 0.1, 0.2, 0.4]))
    exact = np.interp(coarse.bias_V, fine.bias_V, fine.conductance_S_per_cm2)
    size = np.abs(fine.conductance_S_per_cm2).max()
    assert slopes_at(there, coarse) == pytest.approx(exact, abs=0.02 * size)
    assert np.isnan(slopes_at(there, curve_at(there, np.array([0.1])))).all()


def test_peak_and_valley_lie_off_the_grid(diode: tuple[Drive, Curve]) -> None:
    """Neighbours closer than the grid are all lower (higher); scipy finds the same places."""
    from scipy.optimize import minimize_scalar

    there, curve = diode
    region = main_region(regions(there, curve), curve)
    assert region is not None
    assert region.valley is not None
    for point, sign in ((region.peak, -1.0), (region.valley, 1.0)):

        def away(bias: float, sign: float = sign) -> float:
            return sign * float(curve_at(there, np.array([bias])).current_density_A_per_cm2[0])

        near = (point.bias_V - 0.01, point.bias_V + 0.01)
        best = minimize_scalar(away, bounds=near, method="bounded", options={"xatol": 1e-7})
        assert point.bias_V == pytest.approx(best.x, abs=3e-6)
        assert sign * point.current_density_A_per_cm2 <= best.fun + 1e-9 * abs(best.fun)
    assert region.peak_to_valley == pytest.approx(
        region.peak.current_density_A_per_cm2 / region.valley.current_density_A_per_cm2
    )
    assert region.steepest_fall is not None
    steps = np.diff(curve.current_density_A_per_cm2) / np.diff(curve.bias_V)
    assert region.steepest_fall.conductance_S_per_cm2 == pytest.approx(steps.min(), rel=0.02)


def test_a_cusp_is_followed() -> None:
    """A narrow level that drops below the emitter's edge: the peak beats a grid of 1e-6 V."""
    there = drive(two_barriers(4.0, 6.0, 6.0), 0.02, 77.0)
    curve = own_curve(there, 0.0, 0.35)
    region = main_region(regions(there, curve), curve)
    assert region is not None
    assert region.steepest_fall is not None
    near = region.peak.bias_V + np.linspace(-3e-4, 3e-4, 601)
    around = curve_at(there, near).current_density_A_per_cm2
    assert region.peak.current_density_A_per_cm2 >= around.max() * (1.0 - 1e-9)
    fine = np.linspace(region.peak.bias_V, region.peak.bias_V + 2e-3, 2001)
    falls = np.diff(curve_at(there, fine).current_density_A_per_cm2) / np.diff(fine)
    assert region.steepest_fall.conductance_S_per_cm2 <= falls.min() * 0.98
    assert region.steepest_fall.bias_V > region.peak.bias_V


def test_a_range_that_begins_on_a_falling_flank(diode: tuple[Drive, Curve]) -> None:
    there, whole = diode
    first, second = regions(there, own_curve(there, 0.0, 0.9))[:2]
    assert first.steepest_fall is not None
    start = first.steepest_fall.bias_V
    (found, *_) = regions(there, own_curve(there, start, 0.9))
    assert found.peak.bias_V == pytest.approx(second.peak.bias_V, abs=1e-5)
    assert whole.bias_V[0] == 0.0


def test_onset_is_where_the_steepest_tangent_meets_zero(diode: tuple[Drive, Curve]) -> None:
    there, curve = diode
    (region, *_) = regions(there, curve)
    rise = region.steepest_rise
    assert rise is not None
    assert region.onset_V is not None
    assert 0.0 <= region.onset_V < rise.bias_V < region.peak.bias_V
    step = 1e-4
    ends = curve_at(there, rise.bias_V + np.array([-step, step])).current_density_A_per_cm2
    slope = (ends[1] - ends[0]) / (2.0 * step)
    assert rise.conductance_S_per_cm2 == pytest.approx(slope, rel=1e-3)


def test_both_sides_of_a_mirror_symmetric_design() -> None:
    there = drive(two_barriers(3.0, 5.0, 3.0))
    curve = own_curve(there, -0.3, 0.3)
    found = regions(there, curve)
    assert sorted(np.sign([region.peak.bias_V for region in found])) == [-1.0, 1.0]
    first, second = found
    assert first.peak.bias_V == pytest.approx(-second.peak.bias_V, abs=1e-6)
    main = main_region(found, curve)
    assert main is not None
    assert main.peak.bias_V > 0.0


def test_a_single_barrier_has_no_peak() -> None:
    there = drive(stack([(4.0, 0.3, 0.067)]))
    curve = own_curve(there, -0.2, 0.2)
    assert regions(there, curve) == ()
    assert main_region((), curve) is None


def test_a_fall_that_does_not_end_has_no_valley() -> None:
    there = drive(two_barriers(3.0, 5.0, 3.0))
    whole = own_curve(there, 0.0, 0.4)
    (region, *_) = regions(there, whole)
    cut = own_curve(there, 0.0, region.peak.bias_V + 0.02)
    (short,) = regions(there, cut)
    assert short.valley is None
    assert short.peak_to_valley is None
    assert short.peak.bias_V == pytest.approx(region.peak.bias_V, abs=1e-6)


def test_curves_are_joined_in_order() -> None:
    there = drive(two_barriers())
    parts = [curve_at(there, np.array(x)) for x in ([0.3, 0.1], [0.2, 0.1])]
    both = joined_curves(parts)
    assert both.bias_V.tolist() == [0.1, 0.2, 0.3]
    assert both.current_density_A_per_cm2 == pytest.approx(
        curve_at(there, both.bias_V).current_density_A_per_cm2, rel=1e-7
    )


def test_the_drive_can_be_watched() -> None:
    class EnoughError(Exception):
        pass

    def stop() -> None:
        raise EnoughError

    with pytest.raises(EnoughError):
        own_curve(replace(drive(two_barriers()), watch=stop), 0.0, 0.2)
