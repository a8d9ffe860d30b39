"""Filling of a parabolic band, held against mpmath at 40 digits and against closed forms."""

from __future__ import annotations

import math

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from physics.constants import BOLTZMANN_EV_PER_K, HBAR2_OVER_2M0_EV_NM2
from physics.errors import StructureError
from physics.occupation import (
    SOMMERFELD_FROM,
    band_density_cm3,
    donors_from_fermi,
    fermi_dirac_half,
    fermi_from_donors,
)
from physics.ranges import DONORS_CM3, MASS, TEMPERATURE_K

DIGITS = 40

masses = st.floats(math.log(1.001 * MASS.low), math.log(0.999 * MASS.high)).map(math.exp)
temperatures = st.floats(
    math.log(1.001 * TEMPERATURE_K.low), math.log(0.999 * TEMPERATURE_K.high)
).map(math.exp)
donors = st.floats(10.0, 21.99).map(lambda exponent: 10.0**exponent)


def by_quadrature(eta: float, *, slope: bool) -> mp.mpf:
    """F or dF/deta over exp(min(eta, 0)), by tanh-sinh quadrature in u with t = u^2."""

    def integrand(u: mp.mpf) -> mp.mpf:
        occupied = mp.exp(max(0.0, -eta) - u * u + eta) / (1 + mp.exp(eta - u * u))
        return 2 * u * u * occupied / (1 + mp.exp(eta - u * u) if slope else 1)

    with mp.workdps(DIGITS):
        offsets = (-150, -70, -30, -10, 0, 10, 30, 70, 150)
        ends = [mp.sqrt(max(eta, 0.0) + offset) for offset in offsets if eta + offset > 0]
        points = [mp.mpf(0), *ends] if eta > 0.0 else [mp.mpf(n) for n in (0, 2, 5, 13)]
        return mp.quad(integrand, points)


ETA = [-700.0, -300.0, -50.0, -20.0, -9.0, -6.0, -4.0, -3.1, -2.0, -1.0, -0.3, 0.0, 0.5, 1.0, 2.7]
ETA += [5.0, 8.0, 13.0, 21.0, 30.0, 37.0, math.nextafter(SOMMERFELD_FROM, 0.0), SOMMERFELD_FROM]
ETA += [41.0, 50.0, 77.0, 150.0, 1e3, 3e4, 1e6]


@pytest.mark.parametrize("eta", ETA)
def test_integral_and_slope_against_quadrature(eta: float) -> None:
    value, slope = fermi_dirac_half(eta)
    factor = mp.exp(min(eta, 0.0))
    for found, wants_slope in ((value, False), (slope, True)):
        expected = by_quadrature(eta, slope=wants_slope) * factor
        assert abs(mp.mpf(float(found)) / expected - 1) < 1e-14


@pytest.mark.parametrize("eta", [-30.0, -1.5, 0.0, 0.7, 3.0, 20.0])
def test_integral_against_the_polylogarithm(eta: float) -> None:
    """F(eta) = -Gamma(3/2) Li_3/2(-exp(eta)): NIST Digital Library of Math. Functions, 25.12.16."""
    with mp.workdps(DIGITS):
        expected = -mp.gamma(1.5) * mp.re(mp.polylog(mp.mpf(1.5), -mp.exp(eta)))
    assert abs(mp.mpf(float(fermi_dirac_half(eta)[0])) / expected - 1) < 1e-14


def test_integral_takes_arrays_of_any_shape() -> None:
    eta = np.array([[-5.0, 0.0, 39.0], [41.0, 1e6, -700.0]])
    value, slope = fermi_dirac_half(eta)
    assert value.shape == slope.shape == eta.shape
    for one, several, rise in zip(eta.flat, value.flat, slope.flat, strict=True):
        assert fermi_dirac_half(one) == (several, rise)
    assert fermi_dirac_half(np.empty(0))[0].shape == (0,)


@given(st.floats(-700.0, 1e6))
def test_the_two_formulas_meet_and_the_integral_rises(eta: float) -> None:
    here, above = fermi_dirac_half(eta)[0], fermi_dirac_half(eta + 1e-6 * max(1.0, abs(eta)))[0]
    assert 0.0 < here < above


def test_band_density_of_free_electrons() -> None:
    """2.5094e19 cm^-3 for m = m0 at 300 K (S. M. Sze, 2nd ed., from memory: 2.51e19)."""
    assert band_density_cm3(1.0, 300.0) == pytest.approx(2.5094e19, rel=5e-5)
    assert band_density_cm3(0.067, 150.0) == pytest.approx(
        2.5094e19 * (0.067 / 2.0) ** 1.5, rel=5e-5
    )


@given(donors, masses, temperatures)
def test_density_and_fermi_energy_undo_each_other(
    n: float, mass: float, temperature: float
) -> None:
    fermi = fermi_from_donors(n, mass, temperature)
    thermal = BOLTZMANN_EV_PER_K * temperature
    # A relative error r of n is an error of eta of r F / F', at most r max(1, 2 eta / 3).
    assert donors_from_fermi(fermi, mass, temperature) == pytest.approx(
        n, rel=2e-14 + 2e-16 * (abs(fermi) / thermal if fermi < 0.0 else 0.0)
    )


@pytest.mark.parametrize("temperature", [0.01, 4.2, 77.0, 300.0, 2000.0])
@pytest.mark.parametrize("n", [1e10, 1e14, 1e17, 1e18, 5e19, 1e22])
def test_fermi_energy_against_mpmath(n: float, temperature: float) -> None:
    """The equation solved again at 40 digits, with the same constants."""
    mass = 0.067
    fermi = fermi_from_donors(n, mass, temperature)
    thermal = BOLTZMANN_EV_PER_K * temperature
    eta = fermi / thermal
    with mp.workdps(DIGITS):
        wanted = mp.mpf(n) / mp.mpf(band_density_cm3(mass, temperature)) * mp.sqrt(mp.pi) / 2
        factor = mp.exp(min(eta, 0.0))
        value = by_quadrature(eta, slope=False) * factor
        error = (value - wanted) / (by_quadrature(eta, slope=True) * factor)
    assert abs(error) * thermal <= 1e-13 * max(abs(fermi), thermal)


@pytest.mark.parametrize("n", [1e15, 1e18, 1e20])
def test_cold_electrons_fill_the_fermi_sphere(n: float) -> None:
    """E_F = hbar^2 (3 pi^2 n)^(2/3) / 2m at T = 0 (C. Kittel, Introduction to Solid State Physics).

    At 0.01 K the next term of Sommerfeld's series, (pi kT / E_F)^2 / 12, is the only difference.
    """
    mass = 0.067
    cold = HBAR2_OVER_2M0_EV_NM2 / mass * (3.0 * math.pi**2 * n * 1e-21) ** (2.0 / 3.0)
    shift = (math.pi * BOLTZMANN_EV_PER_K * 0.01 / cold) ** 2 / 12.0
    assert fermi_from_donors(n, mass, 0.01) == pytest.approx(cold * (1.0 - shift), rel=1e-12)


def test_few_electrons_follow_boltzmann() -> None:
    """E_F = kT ln(n / Nc), with the next term n / (sqrt(8) Nc): W. B. Joyce and R. W. Dixon (1977).

    Appl. Phys. Lett. 31, 354 (1977), from memory.
    """
    thermal, density = BOLTZMANN_EV_PER_K * 300.0, band_density_cm3(0.067, 300.0)
    for n in (1e10, 1e13, 1e15):
        expected = thermal * (math.log(n / density) + n / (math.sqrt(8.0) * density))
        second = thermal * (n / density) ** 2
        assert abs(fermi_from_donors(n, 0.067, 300.0) - expected) < 0.01 * second + 1e-13


@given(st.floats(min_value=0.0, max_value=DONORS_CM3.high, exclude_min=True), masses, temperatures)
def test_any_doping_has_a_fermi_energy(n: float, mass: float, temperature: float) -> None:
    """However few: the Boltzmann limit is a lower bound, since F(eta) < exp(eta) sqrt(pi) / 2."""
    thermal = BOLTZMANN_EV_PER_K * temperature
    lowest = thermal * (math.log(n) - math.log(band_density_cm3(mass, temperature)))
    fermi = fermi_from_donors(n, mass, temperature)
    assert math.isfinite(fermi)
    assert fermi >= lowest - 1e-12 * max(abs(lowest), thermal)


def test_a_fermi_energy_far_below_the_edge_leaves_no_electrons() -> None:
    assert donors_from_fermi(-1.0, 0.067, 1.0) == 0.0


@pytest.mark.parametrize(
    ("n", "mass", "temperature", "key"),
    [
        (0.0, 0.067, 300.0, "donors_cm3"),
        (-1e18, 0.067, 300.0, "donors_cm3"),
        (math.nan, 0.067, 300.0, "donors_cm3"),
        (math.inf, 0.067, 300.0, "donors_cm3"),
        (1e18, 0.0, 300.0, "mass"),
        (1e18, math.nan, 300.0, "mass"),
        (1e18, 0.067, 0.0, "temperature_K"),
        (1e18, 0.067, math.inf, "temperature_K"),
    ],
)
def test_bad_values_are_refused(n: float, mass: float, temperature: float, key: str) -> None:
    with pytest.raises(StructureError) as refusal:
        fermi_from_donors(n, mass, temperature)
    assert refusal.value.key == key


@pytest.mark.parametrize("fermi", [math.nan, math.inf, -math.inf])
def test_a_fermi_energy_is_finite(fermi: float) -> None:
    with pytest.raises(StructureError, match="finite"):
        donors_from_fermi(fermi, 0.067, 300.0)
