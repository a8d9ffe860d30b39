"""The adaptive grid: every level met, in few points."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from physics.errors import EnergyError
from physics.field import uniform_field
from physics.levels import find_levels
from physics.scattering import scatter
from physics.spectrum import NEAR_EV, adaptive_spectrum
from reference import many_digits
from reference.stacks import as_reference, stack, two_barriers


@pytest.mark.parametrize("barrier", [2.0, 5.0, 10.0, 16.0, 25.0, 60.0])
def test_levels_are_met_however_narrow(barrier: float) -> None:
    profile = uniform_field(two_barriers(barrier, 5.0, barrier + 1.0))
    levels = find_levels(profile, 0.0, 0.2)
    spectrum = adaptive_spectrum(profile, 0.0, 0.2, levels)
    assert len(levels.levels) == 1
    level = levels.levels[0]
    nearest = int(np.argmin(np.abs(spectrum.energy_eV - level.energy_eV)))
    assert abs(spectrum.energy_eV[nearest] - level.energy_eV) <= 1e-15
    peak = spectrum.transmission[nearest]
    assert peak == pytest.approx(level.peak_transmission, rel=0.05)
    assert spectrum.energy_eV.size < 420
    assert np.all(np.diff(spectrum.energy_eV) > 0.0)
    assert spectrum.energy_eV[0] == 0.0
    assert spectrum.energy_eV[-1] == 0.2


def test_line_of_a_narrow_level_against_the_reference() -> None:
    """Half a width from a line of 1e-12 eV, whose place no double can hold: 50 digits say so."""
    structure = two_barriers(18.0, 5.0, 18.5)
    profile = uniform_field(structure)
    levels = find_levels(profile, 0.0, 0.15)
    level = levels.levels[0]
    assert 1e-14 < level.width_eV < 1e-10
    spectrum = adaptive_spectrum(profile, 0.0, 0.15, levels)
    exact_pole = many_digits.pole(as_reference(structure), complex(level.energy_eV, 0.0))
    near = np.abs(spectrum.energy_eV - level.energy_eV) <= NEAR_EV
    assert near.sum() > 8
    for energy, log_t in zip(
        spectrum.energy_eV[near], spectrum.log10_transmission[near], strict=True
    ):
        at = mp.re(exact_pole) + (mp.mpf(float(energy)) - mp.mpf(level.energy_eV))
        exact, _ = many_digits.transmission(as_reference(structure), at)
        assert float(log_t) == pytest.approx(float(mp.log10(exact)), abs=1e-5)


def test_plain_points_are_plain() -> None:
    profile = uniform_field(two_barriers(), 0.1)
    levels = find_levels(profile, -0.1, 0.3)
    spectrum = adaptive_spectrum(profile, -0.1, 0.3, levels)
    plain = scatter(profile, spectrum.energy_eV)
    assert spectrum.log10_transmission == pytest.approx(plain.log10_transmission, rel=1e-9)
    assert spectrum.dwell_time_s == pytest.approx(plain.dwell_time_s, rel=1e-9, nan_ok=True)


def test_a_straight_line_between_points_is_close() -> None:
    profile = uniform_field(two_barriers(4.0, 8.0, 5.0), 0.05)
    levels = find_levels(profile, 0.0, 0.3)
    spectrum = adaptive_spectrum(profile, 0.0, 0.3, levels)
    energy = np.linspace(1e-3, 0.299, 5001)
    drawn = np.interp(energy, spectrum.energy_eV, spectrum.log10_transmission)
    exact = scatter(profile, energy).log10_transmission
    assert np.abs(drawn - exact).max() < 0.06


def test_empty_window() -> None:
    profile = uniform_field(stack([(2.0, 0.3, 0.09)]))
    levels = find_levels(profile, 0.0, 0.3)
    with pytest.raises(EnergyError):
        adaptive_spectrum(profile, 0.3, 0.3, levels)
