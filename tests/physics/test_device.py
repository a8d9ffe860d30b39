"""Device figures against their formulas, worked by hand or by another library."""

import math
from dataclasses import replace

import numpy as np
import pytest
import scipy.constants as si
from scipy.integrate import quad

from physics.device import (
    Mesa,
    cutoff_Hz,
    device_figures,
    plate_capacitance_F_per_cm2,
    transit_time_s,
)
from physics.extremes import Point, Region, Slope
from physics.field import uniform_field
from physics.levels import find_levels
from physics.structure import Layer
from reference.stacks import stack, two_barriers

REGION = Region(
    peak=Point(0.4, 5e4, 1.0),
    valley=Point(0.6, 1e4, 1.0),
    steepest_rise=Slope(0.3, 2e4, 4e5),
    steepest_fall=Slope(0.5, 3e4, -6e5),
)
STRUCTURE = two_barriers()
PROFILE = uniform_field(STRUCTURE, 0.1)
(LEVEL, *_) = find_levels(PROFILE, 0.001, 0.2).levels


def test_per_area() -> None:
    figures = device_figures(REGION, PROFILE, LEVEL, Mesa(), 5e-7)
    assert figures.peak_kA_per_cm2 == pytest.approx(50.0)
    assert figures.peak_mA_per_um2 == pytest.approx(0.5)  # 1 kA/cm2 = 0.01 mA/um2
    assert figures.voltage_swing_V == pytest.approx(0.2)
    assert figures.current_swing_A_per_cm2 == pytest.approx(4e4)
    assert figures.available_power_W_per_cm2 == pytest.approx(3.0 / 16.0 * 0.2 * 4e4)
    assert figures.negative_conductance_S_per_cm2 == -6e5
    assert figures.dissipated_W_per_cm2 == pytest.approx(2e4)  # 0.4 V times 5e4 beats 0.6 times 1e4
    assert figures.dwell_time_s == LEVEL.lifetime_s
    assert figures.peak_current_A is None
    assert figures.cutoff_Hz is None
    assert "mesa_um2" in figures.cutoff_said


def test_quantum_capacitance() -> None:
    """-G hbar / Gamma_collector (R. Lake and J. Yang, 2003, from memory), either way round."""
    ahead = device_figures(REGION, PROFILE, LEVEL, Mesa(), 5e-7)
    hbar = si.hbar / si.e
    assert ahead.quantum_F_per_cm2 == pytest.approx(6e5 * hbar / LEVEL.right_width_eV, rel=1e-9)
    back = replace(REGION, peak=replace(REGION.peak, bias_V=-0.4))
    figures = device_figures(back, PROFILE, LEVEL, Mesa(), 5e-7)
    assert figures.quantum_F_per_cm2 == pytest.approx(6e5 * hbar / LEVEL.left_width_eV, rel=1e-9)


def test_of_a_mesa() -> None:
    mesa = Mesa(area_um2=4.0, series_ohm=5.0, parallel_fF=2.0)
    figures = device_figures(REGION, PROFILE, LEVEL, mesa, 5e-7)
    assert figures.peak_current_A == pytest.approx(2e-3)
    assert figures.available_power_W == pytest.approx(1500.0 * 4e-8)
    assert figures.negative_resistance_ohm == pytest.approx(-1.0 / (6e5 * 4e-8))
    assert figures.quantum_F_per_cm2 is not None
    conductance = 6e5 * 4e-8
    capacitance = (5e-7 + figures.quantum_F_per_cm2) * 4e-8 + 2e-15
    # The frequency at which the real part of R + 1 / (-G + i omega C) is 0.
    assert figures.cutoff_Hz is not None
    omega = 2.0 * math.pi * figures.cutoff_Hz
    assert (5.0 + 1.0 / (-conductance + 1j * omega * capacitance)).real == pytest.approx(
        0.0, abs=1e-9
    )


@pytest.mark.parametrize(
    ("slope", "mesa", "said"),
    [
        (None, Mesa(1.0, 1.0), "no negative conductance"),
        (0.0, Mesa(1.0, 1.0), "no negative conductance"),
        (-1e6, Mesa(1.0), "series_ohm"),
        (-1e6, Mesa(1.0, 0.0), "without a series resistance"),
        (-1e6, Mesa(1.0, 200.0), "no gain"),
    ],
)
def test_why_there_is_no_cut_off(slope: float | None, mesa: Mesa, said: str) -> None:
    frequency, why = cutoff_Hz(slope, 1e-6, mesa)
    assert frequency is None
    assert said in why


def test_without_a_valley_or_a_level() -> None:
    figures = device_figures(replace(REGION, valley=None), PROFILE, None, Mesa(1.0), 5e-7)
    assert figures.voltage_swing_V is None
    assert figures.available_power_W_per_cm2 is None
    assert figures.quantum_F_per_cm2 is None
    assert figures.transit_time_s is None
    assert figures.peak_current_A is not None


def test_plates_in_series() -> None:
    """epsilon_0 / sum(d / epsilon_r) by scipy's constants."""
    structure = replace(
        STRUCTURE, layers=(Layer(10.0, 0.3, 0.1, permittivity=10.0), Layer(12.9, 0.0, 0.067))
    )
    exact = si.epsilon_0 / (10e-9 / 10.0 + 12.9e-9 / 12.9) * 1e-4
    assert plate_capacitance_F_per_cm2(structure) == pytest.approx(exact, rel=1e-9)


@pytest.mark.parametrize("bias_V", [0.15, -0.15])
def test_transit_time_is_that_of_a_ball_on_a_slope(bias_V: float) -> None:
    """Integral of dx / v over the collector's spacer, v = sqrt(2 (E - V) / m)."""
    structure = stack(
        [
            (20.0, 0.0, 0.067),
            (2.0, 0.3, 0.09),
            (5.0, 0.0, 0.067),
            (2.0, 0.3, 0.09),
            (20.0, 0.0, 0.067),
        ]
    )
    profile = uniform_field(structure, bias_V)
    low = max(profile.contact_edge_eV) + 1e-4
    level = max(find_levels(profile, low, low + 0.2).levels, key=lambda x: x.share_by_layer[2])
    length, slope = structure.thickness_nm, bias_V / structure.thickness_nm
    start, stop = (29.0, length) if bias_V > 0.0 else (0.0, 20.0)

    def slowness(x_nm: float) -> float:
        kinetic = (level.energy_eV + slope * x_nm) * si.e
        return 1e-9 / math.sqrt(2.0 * kinetic / (0.067 * si.m_e))

    exact = quad(slowness, start, stop)[0]
    assert transit_time_s(profile, level, bias_V) == pytest.approx(exact, rel=1e-8)


def test_transit_of_a_two_band_electron() -> None:
    """dE / (hbar dk) with c k^2 = m (1 + e / Eg) e, integrated by scipy."""
    bare = stack([(2.0, 0.4, 0.09), (5.0, 0.0, 0.05), (2.0, 0.4, 0.09), (20.0, 0.0, 0.05)])
    layers = tuple(replace(layer, gap_eV=0.8) for layer in bare.layers)
    left, right = (replace(side, gap_eV=0.8) for side in (bare.left, bare.right))
    structure = replace(bare, left=left, layers=layers, right=right)
    profile = uniform_field(structure, 0.2, band="kane")
    (level, *_) = find_levels(profile, 1e-3, 0.25).levels
    c = si.hbar**2 / (2.0 * si.m_e) / si.e * 1e18

    def slowness(x_nm: float) -> float:
        above = level.energy_eV + 0.2 * x_nm / structure.thickness_nm
        wave = math.sqrt(0.05 * (1.0 + above / 0.8) * above / c)
        return si.hbar / si.e * 0.05 * (1.0 + 2.0 * above / 0.8) / (2.0 * c * wave)

    exact = quad(slowness, 9.0, structure.thickness_nm)[0]
    assert transit_time_s(profile, level, 0.2) == pytest.approx(exact, rel=2e-3)


def test_no_barrier_no_transit() -> None:
    profile = uniform_field(stack([(5.0, 0.0, 0.067)]))
    assert np.isfinite(transit_time_s(profile, LEVEL, 0.1))
