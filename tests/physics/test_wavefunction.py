"""Densities and the local density of states against closed forms."""

from __future__ import annotations

import math

import numpy as np
import pytest

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C
from physics.errors import EnergyError, StructureError
from physics.field import uniform_field
from physics.levels import find_levels
from physics.scattering import scatter
from physics.wavefunction import (
    FROM_LEFT,
    FROM_RIGHT,
    ONE_ELECTRON,
    level_state,
    local_density_of_states,
    scattering_state,
)
from reference.stacks import stack, two_barriers


def test_decay_behind_a_step() -> None:
    """Behind a step of one mass |psi|^2 = 4 E / V exp(-2 q x) (closed form)."""
    height, energy, mass = 0.4, 0.13, 0.067
    profile = uniform_field(stack([(3.0, height, mass)], (0.0, mass), (height, mass)))
    state = scattering_state(profile, energy)
    q = math.sqrt(mass * (height - energy) / C)
    expected = 4.0 * energy / height * np.exp(-2.0 * q * state.x_nm)
    assert state.density_per_nm == pytest.approx(expected, rel=1e-12)
    assert state.norm == FROM_LEFT


def test_density_at_the_right_face_is_the_transmission() -> None:
    profile = uniform_field(two_barriers(), 0.1)
    energy = 0.05
    state = scattering_state(profile, energy)
    t = float(scatter(profile, np.array([energy])).transmission[0])
    velocity_ratio = math.sqrt(energy / (energy + 0.1))
    assert state.density_per_nm[-1] == pytest.approx(t * velocity_ratio, rel=1e-12)
    assert state.x_nm[0] == 0.0
    assert state.x_nm[-1] == profile.length_nm
    assert np.all(np.diff(state.x_nm) > 0.0)


def test_comes_from_the_right_where_the_left_is_closed() -> None:
    profile = uniform_field(two_barriers(), 0.1)
    assert scattering_state(profile, -0.05).norm == FROM_RIGHT
    with pytest.raises(EnergyError, match="both contacts are closed"):
        scattering_state(profile, -0.15)


def test_bound_state_of_a_finite_well() -> None:
    """cos^2 inside, exp(-2 q x) outside (closed form); the tails are part of the norm."""
    depth, width, mass = 0.3, 10.0, 0.067
    profile = uniform_field(stack([(width, 0.0, mass)], (depth, mass), (depth, mass)))
    level = find_levels(profile, 0.0, depth).levels[0]
    k = math.sqrt(mass * level.energy_eV / C)
    q = math.sqrt(mass * (depth - level.energy_eV) / C)
    state = level_state(profile, level)
    shape = np.cos(k * (state.x_nm - width / 2)) ** 2
    inside = width / 2 + math.sin(k * width) / (2 * k)
    outside = math.cos(k * width / 2) ** 2 / q
    assert state.density_per_nm == pytest.approx(shape / (inside + outside), rel=1e-10, abs=1e-12)
    assert sum(level.share_by_layer) == pytest.approx(inside / (inside + outside), rel=1e-12)
    assert state.norm == ONE_ELECTRON


def test_quasi_bound_level_holds_one_electron() -> None:
    profile = uniform_field(two_barriers(4.0, 5.0, 3.0), 0.05)
    for level in find_levels(profile, 0.0, 0.3).levels:
        state = level_state(profile, level, 20_000)
        assert np.trapezoid(state.density_per_nm, state.x_nm) == pytest.approx(1.0, rel=1e-6)
        assert sum(level.share_by_layer) == pytest.approx(1.0, rel=1e-12)


def test_local_density_of_states_of_free_electrons() -> None:
    """1 / (pi hbar v) per spin, everywhere (textbook, e.g. Economou, ch. 1, from memory)."""
    mass, energy = 0.067, np.array([0.03, 0.2])
    profile = uniform_field(stack([(6.0, 0.0, mass)]))
    density = local_density_of_states(profile, np.linspace(0.0, 6.0, 5), energy)
    hbar_v = 2.0 * np.sqrt(C * energy / mass)
    assert density == pytest.approx(np.tile(1.0 / (np.pi * hbar_v), (5, 1)), rel=1e-12)


def test_local_density_of_states_is_the_sum_over_both_contacts() -> None:
    """rho = sum over open contacts of |psi|^2 / (2 pi hbar v) (scattering theory, textbook)."""
    structure = two_barriers(2.0, 5.0, 3.0)
    profile = uniform_field(structure)
    mirrored = uniform_field(two_barriers(3.0, 5.0, 2.0))
    energy = 0.0912
    left = scattering_state(profile, energy, 40)
    right = scattering_state(mirrored, energy, 40)
    x = left.x_nm[1:-1:7]
    from_right = np.interp(profile.length_nm - x, right.x_nm, right.density_per_nm)
    on_grid = np.isin(np.round(profile.length_nm - x, 9), np.round(right.x_nm, 9))
    total = np.interp(x, left.x_nm, left.density_per_nm) + from_right
    hbar_v = 2.0 * math.sqrt(C * energy / 0.067)
    density = local_density_of_states(profile, x, np.array([energy]))[:, 0]
    tolerance = np.where(on_grid, 1e-10, 2e-3)
    assert np.all(np.abs(density / (total / (2.0 * np.pi * hbar_v)) - 1.0) < tolerance)


def test_local_density_of_states_of_a_level() -> None:
    """Across a narrow line the local density of states integrates to the level's density."""
    profile = uniform_field(two_barriers(5.0, 5.0, 5.0))
    level = find_levels(profile, 0.05, 0.15).levels[0]
    # E = E_r + (Gamma / 2) tan(theta): the Lorentzian becomes flat.
    theta, weight = np.polynomial.legendre.leggauss(60)
    theta, weight = theta * 1.55, weight * 1.55
    energy = level.energy_eV + 0.5 * level.width_eV * np.tan(theta)
    x = np.array([6.1, 7.5, 9.0])
    density = local_density_of_states(profile, x, energy)
    slope = 0.5 * level.width_eV / np.cos(theta) ** 2
    integral = (density * slope * weight).sum(axis=1) * np.pi / (2.0 * 1.55)
    state = level_state(profile, level, 4000)
    assert integral == pytest.approx(np.interp(x, state.x_nm, state.density_per_nm), rel=1e-2)


def test_positions_outside_are_refused() -> None:
    profile = uniform_field(two_barriers())
    with pytest.raises(StructureError, match="x_nm"):
        local_density_of_states(profile, np.array([-1.0]), np.array([0.1]))
