"""Figures of the device that a stack is made into, from its current curve.

All are per area unless a mesa is stated. They are those of a diode biased between peak and valley:

- power: 3/16 of voltage swing times current swing, the most that a cubic through peak and valley
  gives a load (C. S. Kim and A. Braendli, IRE Trans. Circuit Theory 8, 416 (1961), from memory);
- space-charge capacitance: the contacts' faces as plates, permittivities in series;
- quantum capacitance: -G times the time in which the level empties into the collector,
  hbar / Gamma_collector (R. Lake and J. Yang, IEEE Trans. Electron Devices 50, 785 (2003), from
  memory); it adds to the other;
- transit time: of a ballistic electron at the level's energy from the collector barrier to the
  contact; scattering makes it longer;
- cut-off: where the series resistance eats up the negative one,
  G / (2 pi C) * sqrt(1 / (R G) - 1) (textbook, e.g. S. M. Sze, sec. 9.3, from memory).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.constants import (
    ELECTRIC_CONSTANT_F_PER_M,
    HBAR2_OVER_2M0_EV_NM2,
    HBAR_EV_S,
)
from physics.extremes import Region
from physics.field import ASSUMED_PERMITTIVITY, Profile
from physics.levels import Level
from physics.structure import Structure

FloatArray = NDArray[np.float64]

CUBIC = 3.0 / 16.0
A_PER_CM2_IN_KA, A_PER_CM2_IN_MA_PER_UM2 = 1e-3, 1e-5
UM2_IN_CM2 = 1e-8
F_PER_M2_IN_F_PER_CM2 = 1e-4
HOT_W_PER_CM2 = 1e4
"""Dissipation from which small mesas have been seen to burn out in continuous operation (common
practice; order of magnitude)."""


@dataclass(frozen=True)
class Mesa:
    """What is stated of the device; None: not stated."""

    area_um2: float | None = None
    series_ohm: float | None = None
    parallel_fF: float | None = None


@dataclass(frozen=True)
class Figures:
    """Figures at a peak and the valley behind it; None where they cannot be had."""

    peak_kA_per_cm2: float
    peak_mA_per_um2: float
    voltage_swing_V: float | None
    current_swing_A_per_cm2: float | None
    available_power_W_per_cm2: float | None
    negative_conductance_S_per_cm2: float | None
    """The most negative slope between peak and valley."""
    space_charge_F_per_cm2: float
    quantum_F_per_cm2: float | None
    dwell_time_s: float | None
    """hbar / Gamma of the level that carries most of the peak current."""
    transit_time_s: float | None
    dissipated_W_per_cm2: float
    """Larger one of current times bias at peak and valley."""
    peak_current_A: float | None
    available_power_W: float | None
    negative_resistance_ohm: float | None
    cutoff_Hz: float | None
    cutoff_said: str
    """Why there is no cut-off frequency; empty where there is one."""


def device_figures(
    region: Region,
    profile: Profile,
    level: Level | None,
    mesa: Mesa,
    space_charge_F_per_cm2: float,
) -> Figures:
    """Work the figures out.

    Parameters
    ----------
    region : Region
        Peak, valley and slopes.
    profile : Profile
        The bands at the peak.
    level : Level, optional
        The level that carries most of the current there.
    mesa : Mesa
        What is stated of the device.
    space_charge_F_per_cm2 : float
        As `plate_capacitance_F_per_cm2`, or from a screened field.
    """
    peak, valley = region.peak, region.valley
    peak_J = abs(peak.current_density_A_per_cm2)
    swing_V = swing_J = None
    hottest = abs(peak.bias_V) * peak_J
    if valley is not None:
        swing_V = abs(valley.bias_V - peak.bias_V)
        swing_J = peak_J - abs(valley.current_density_A_per_cm2)
        hottest = max(hottest, abs(valley.bias_V * valley.current_density_A_per_cm2))
    power = None if swing_V is None or swing_J is None else CUBIC * swing_V * swing_J
    fall = region.steepest_fall
    slope = None if fall is None else min(0.0, fall.conductance_S_per_cm2)
    quantum = _quantum_capacitance(slope, level, peak.bias_V)
    capacitance = space_charge_F_per_cm2 + (quantum or 0.0)
    cutoff, said = cutoff_Hz(slope, capacitance, mesa)
    area = None if mesa.area_um2 is None else mesa.area_um2 * UM2_IN_CM2
    return Figures(
        peak_kA_per_cm2=peak_J * A_PER_CM2_IN_KA,
        peak_mA_per_um2=peak_J * A_PER_CM2_IN_MA_PER_UM2,
        voltage_swing_V=swing_V,
        current_swing_A_per_cm2=swing_J,
        available_power_W_per_cm2=power,
        negative_conductance_S_per_cm2=slope,
        space_charge_F_per_cm2=space_charge_F_per_cm2,
        quantum_F_per_cm2=quantum,
        dwell_time_s=None if level is None else level.lifetime_s,
        transit_time_s=None
        if level is None
        else transit_time_s(profile, level, peak.bias_V) or None,
        dissipated_W_per_cm2=hottest,
        peak_current_A=None if area is None else peak_J * area,
        available_power_W=None if area is None or power is None else power * area,
        negative_resistance_ohm=None if area is None or not slope else 1.0 / (slope * area),
        cutoff_Hz=cutoff,
        cutoff_said=said,
    )


def plate_capacitance_F_per_cm2(structure: Structure) -> float:
    """Capacitance of the contacts' faces across the layers."""
    inverse_nm = math.fsum(
        layer.thickness_nm
        / (ASSUMED_PERMITTIVITY if layer.permittivity is None else layer.permittivity)
        for layer in structure.layers
    )
    return ELECTRIC_CONSTANT_F_PER_M / (inverse_nm * 1e-9) * F_PER_M2_IN_F_PER_CM2


def cutoff_Hz(
    slope_S_per_cm2: float | None, capacitance_F_per_cm2: float, mesa: Mesa
) -> tuple[float | None, str]:
    """Frequency up to which the diode is active, or why it cannot be said."""
    if not slope_S_per_cm2:
        return None, "there is no negative conductance"
    if mesa.area_um2 is None or mesa.series_ohm is None:
        return None, "state [device] mesa_um2 and series_ohm"
    area = mesa.area_um2 * UM2_IN_CM2
    conductance = -slope_S_per_cm2 * area
    capacitance = capacitance_F_per_cm2 * area + (mesa.parallel_fF or 0.0) * 1e-15
    share = mesa.series_ohm * conductance
    if share >= 1.0:
        return None, "the series resistance exceeds the negative one: no gain at any frequency"
    if share == 0.0:
        return None, "without a series resistance there is no cut-off"
    return conductance / (2.0 * math.pi * capacitance) * math.sqrt(1.0 / share - 1.0), ""


def transit_time_s(profile: Profile, level: Level, bias_V: float) -> float:
    """Time of a ballistic electron from the collector's barrier to its contact, level's energy."""
    energy = level.energy_eV
    left, right = profile.edge_left_eV, profile.edge_right_eV
    blocked = np.flatnonzero(np.maximum(left, right) >= energy)
    if blocked.size == 0:
        return 0.0
    free = slice(blocked[-1] + 1, None) if bias_V >= 0.0 else slice(0, blocked[0])
    above = energy - left[free], energy - right[free]
    mass = 0.5 * (profile.mass_left + profile.mass_right)[free]
    slope = 0.5 * (profile.mass_slope_left + profile.mass_slope_right)[free]
    # v = 2 sqrt(c (E - V) / m) / hbar; a linear edge has 1/v = 2 / (v_left + v_right) in the mean.
    speed_nm_s = np.sqrt(HBAR2_OVER_2M0_EV_NM2 / mass) * (np.sqrt(above[0]) + np.sqrt(above[1]))
    slower = [_two_band_slowness(mass, slope, x) for x in (*above, 0.5 * (above[0] + above[1]))]
    factor = (slower[0] + slower[1] + 4.0 * slower[2]) / 6.0
    return float(np.sum(profile.thickness_nm[free] * factor * HBAR_EV_S / speed_nm_s))


def _two_band_slowness(mass: FloatArray, slope: FloatArray, above_eV: FloatArray) -> FloatArray:
    """Give how much slower the two-band mass m + b (E - V) makes an electron; 1 where b = 0.

    From hbar v = dE/dk with c k^2 = (m + b (E - V)) (E - V).
    """
    slower: FloatArray = (mass + 2.0 * slope * above_eV) / np.sqrt(mass * (mass + slope * above_eV))
    return slower


def _quantum_capacitance(
    slope_S_per_cm2: float | None, level: Level | None, bias_V: float
) -> float | None:
    if slope_S_per_cm2 is None or level is None:
        return None
    collector = level.right_width_eV if bias_V >= 0.0 else level.left_width_eV
    return -slope_S_per_cm2 * HBAR_EV_S / collector if collector > 0.0 else None
