"""Lost coherence against closed forms, a lattice of dense matrices, limits and symmetries."""

from __future__ import annotations

import math
from dataclasses import replace

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from physics.constants import HBAR_EV_S
from physics.dephasing import (
    Dephasing,
    dephasing_eV,
    effective_transmission,
    scatter_dephased,
    wells_of,
)
from physics.errors import StructureError
from physics.field import uniform_field
from physics.levels import Level, find_levels
from physics.scattering import scatter
from physics.sectors import cut
from physics.spectrum import adaptive_spectrum
from physics.structure import Structure
from reference import probes
from reference.stacks import as_reference, stack, two_barriers

BARRIER, WELL = (2.0, 0.3, 0.092), (5.0, 0.0, 0.067)
TWO_WELLS = stack([BARRIER, WELL, (3.0, 0.25, 0.085), (6.0, 0.02, 0.07), BARRIER])
THREE_WELLS = stack(
    [BARRIER, WELL, (1.5, 0.3, 0.092), (4.0, -0.05, 0.06), (2.0, 0.35, 0.1), WELL, BARRIER],
    right=(-0.02, 0.05),
)
ENERGIES = np.linspace(0.003, 0.7, 233)


def lowest_level(structure: Structure) -> Level:
    return find_levels(uniform_field(structure), 1e-3, 0.25).levels[0]


def stone_lee(level: Level, gained: float, energy: np.ndarray) -> np.ndarray:
    """A. D. Stone and P. A. Lee, Phys. Rev. Lett. 54, 1196 (1985), from memory."""
    own, total = level.width_eV, level.width_eV + gained
    lorentz = total / ((energy - level.energy_eV) ** 2 + 0.25 * total**2)
    return level.left_width_eV * level.right_width_eV / own * lorentz


@pytest.mark.parametrize("times", [0.01, 1.0, 30.0])
def test_one_isolated_level(times: float) -> None:
    """Line, peak and area of a line of 1e-6 eV: other levels, 0.2 eV away, add nothing to it.

    Its partial widths grow with the energy, which shows in the wings of the widest line by 4e-4.
    """
    structure = two_barriers(11.0, 5.0, 10.0)
    level = lowest_level(structure)
    width = times * level.width_eV
    gained = Dephasing(width, wells_of(structure)).of_level_eV(level.share_by_layer)
    assert 0.85 * width < gained < width
    total = level.width_eV + gained
    energy = level.energy_eV + 0.5 * total * np.tan(np.linspace(-1.5, 1.5, 2001))
    result = scatter_dephased(uniform_field(structure), structure, energy, width)
    assert result.transmission == pytest.approx(stone_lee(level, gained, energy), rel=1e-3)
    middle = result.transmission[1000]
    assert middle == pytest.approx(level.peak_transmission * level.width_eV / total, rel=1e-4)
    assert result.transmission[500] / middle == pytest.approx(
        1.0 / (1.0 + math.tan(0.75) ** 2), rel=1e-3
    )
    area = np.trapezoid(result.transmission, energy)
    whole = 2.0 * math.pi * level.left_width_eV * level.right_width_eV / level.width_eV
    assert area == pytest.approx(whole * 3.0 / math.pi, rel=1e-3)


@pytest.mark.parametrize("structure", [two_barriers(), TWO_WELLS, THREE_WELLS])
def test_no_width_is_the_coherent_answer_to_the_last_bit(structure: Structure) -> None:
    profile = uniform_field(structure, 0.05)
    plain = scatter(profile, ENERGIES)
    none = scatter_dephased(profile, structure, ENERGIES, 0.0)
    assert np.array_equal(none.transmission, plain.transmission)
    assert np.array_equal(none.reflection, plain.reflection)
    assert np.array_equal(none.log10_transmission, plain.log10_transmission)
    little = scatter_dephased(profile, structure, ENERGIES, 1e-13)
    assert little.transmission == pytest.approx(plain.transmission, rel=1e-9)


def test_without_a_well_nothing_is_lost() -> None:
    structure = stack([(3.0, 0.0, 0.067), BARRIER, (3.0, 0.0, 0.067)])
    profile = uniform_field(structure)
    result = scatter_dephased(profile, structure, ENERGIES, 0.01)
    assert np.array_equal(result.transmission, scatter(profile, ENERGIES).transmission)


@pytest.mark.parametrize("gamma", [2e-3, 5e-2])
@pytest.mark.parametrize("bias", [0.0, 0.1])
@pytest.mark.parametrize("structure", [two_barriers(), TWO_WELLS, THREE_WELLS])
def test_against_dense_matrices_on_a_lattice(
    structure: Structure, bias: float, gamma: float
) -> None:
    """Richardson's step takes the lattice's error, spacing squared, to some 1e-5."""
    profile = uniform_field(structure, bias)
    wells = wells_of(structure)
    thickness = [layer.thickness_nm for layer in structure.layers]
    mass = [layer.mass for layer in structure.layers]
    edges = zip(profile.edge_left_eV.tolist(), profile.edge_right_eV.tolist(), strict=True)
    layers = [
        (d, left, right, m, well)
        for d, (left, right), m, well in zip(thickness, edges, mass, wells, strict=True)
    ]
    contacts = tuple(zip(profile.contact_edge_eV, profile.contact_mass, strict=True))
    energies = np.array([0.043, 0.21])
    ours = scatter_dephased(profile, structure, energies, gamma).transmission
    for energy, value in zip(energies, ours, strict=True):
        coarse, fine = (
            probes.transmission(layers, contacts, float(energy), gamma, spacing)
            for spacing in (0.1, 0.05)
        )
        assert value == pytest.approx((4.0 * fine - coarse) / 3.0, rel=1e-4)


@pytest.mark.parametrize("gamma", [1e-12, 1e-9, 1e-5, 1e-2, 0.5])
@pytest.mark.parametrize("bias", [0.0, 0.12])
def test_one_well_at_many_digits(bias: float, gamma: float) -> None:
    structure = stack([(4.0, 0.3, 0.09), (7.0, 0.0, 0.067), (6.0, 0.4, 0.1)], right=(-0.01, 0.05))
    at = np.array([1e-4, 0.0321, 0.15, 0.4, 1.1])
    result = scatter_dephased(uniform_field(structure, bias), structure, at, gamma)
    for energy, value in zip(at, result.log10_transmission, strict=True):
        with mp.workdps(100):  # Airy functions of complex numbers lose half of them
            exact = probes.one_well(as_reference(structure, bias), 1, float(energy), gamma)
        assert float(value) == pytest.approx(float(mp.log10(exact)), abs=1e-13)


@pytest.mark.parametrize("energy", [0.2, 0.35, 0.5])
def test_much_lost_is_two_barriers_in_series(energy: float) -> None:
    """Buttiker (1988), from memory: 1/T = 1/T_1 + 1/T_2 once no wave gets through the well.

    Classical addition, 1/T - 1 = sum of (1/T_i - 1), and one more for the probe, which forgets the
    direction too. The loss itself reflects: by Gamma_phi / 8 E in amplitude, hence the tolerance.
    """
    first, second = (2.0, 0.3, 0.092), (3.0, 0.25, 0.08)
    at, gamma = np.array([energy]), 5e-3
    singles = [scatter(uniform_field(stack([one])), at).transmission[0] for one in (first, second)]
    structure = stack([first, (5000.0, 0.0, 0.067), second])
    result = scatter_dephased(uniform_field(structure), structure, at, gamma)
    assert result.coherent_transmission[0] < 1e-8
    expected = 1.0 / (1.0 / singles[0] + 1.0 / singles[1])
    assert result.transmission[0] == pytest.approx(expected, rel=2.0 * gamma / (8.0 * energy))


@pytest.mark.parametrize("gamma", [1e-9, 1e-5, 1e-3, 0.1])
def test_there_and_back(gamma: float) -> None:
    there = scatter_dephased(uniform_field(THREE_WELLS), THREE_WELLS, ENERGIES, gamma)
    back = replace(
        THREE_WELLS,
        left=THREE_WELLS.right,
        layers=THREE_WELLS.layers[::-1],
        right=THREE_WELLS.left,
    )
    result = scatter_dephased(uniform_field(back), back, ENERGIES, gamma)
    assert result.transmission == pytest.approx(there.transmission, rel=1e-10)
    assert result.coherent_transmission == pytest.approx(there.coherent_transmission, rel=1e-10)


@settings(max_examples=60, deadline=None)
@given(
    heights=st.lists(st.floats(0.05, 0.6), min_size=2, max_size=5),
    thicknesses=st.lists(st.floats(0.3, 12.0), min_size=9, max_size=9),
    bias=st.floats(-0.4, 0.4),
    log_gamma=st.floats(-14.0, 0.0),
)
def test_t_lies_between_nothing_and_all(
    heights: list[float], thicknesses: list[float], bias: float, log_gamma: float
) -> None:
    layers: list[tuple[float, ...]] = []
    for height in heights:
        layers += [(thicknesses[len(layers)], height, 0.09)]
        layers += [(thicknesses[len(layers)], 0.0, 0.067)] if len(layers) < 8 else []
    structure = stack(layers)
    profile = uniform_field(structure, bias)
    result = scatter_dephased(profile, structure, ENERGIES, 10.0**log_gamma)
    assert np.all(np.isfinite(result.transmission))
    assert np.all(result.transmission >= 0.0)
    assert np.all(result.transmission <= 1.0 + 1e-12)
    assert np.all(result.coherent_transmission <= result.transmission * (1.0 + 1e-12))
    shut = max(profile.contact_edge_eV) >= ENERGIES
    assert np.all(result.transmission[shut] == 0.0)


@pytest.mark.parametrize("gamma", [1e-7, 1e-3])
def test_opaque_barriers(gamma: float) -> None:
    """No overflow at 1e-450 and below, and still the closed form on the level."""
    structure = stack([(160.0, 1.0, 0.3), (5.0, 0.0, 0.067), (150.0, 1.0, 0.3)])
    profile = uniform_field(structure)
    level = lowest_level(structure)
    assert level.log10_width_eV < -300.0
    gained = Dephasing(gamma, wells_of(structure)).of_level_eV(level.share_by_layer)
    result = scatter_dephased(profile, structure, np.array([level.energy_eV]), gamma)
    peak = math.log10(level.peak_transmission) + level.log10_width_eV - math.log10(gained)
    assert float(result.log10_transmission[0]) == pytest.approx(peak, abs=1e-5)
    assert np.all(np.isfinite(scatter_dephased(profile, structure, ENERGIES, gamma).transmission))


@pytest.mark.parametrize("gamma", [1e-11, 1e-9, 1e-6])
def test_the_spectrum_resolves_the_broadened_line(gamma: float) -> None:
    """The peak that Stone and Lee's line has, met on the grid although Gamma is 1e-12 eV."""
    structure = two_barriers(18.0, 5.0, 18.5)
    profile = uniform_field(structure)
    levels = find_levels(profile, 0.0, 0.15)
    dephasing = Dephasing(gamma, wells_of(structure))
    spectrum = adaptive_spectrum(profile, 0.0, 0.15, levels, dephasing)
    level = levels.levels[0]
    gained = dephasing.of_level_eV(level.share_by_layer)
    energy = spectrum.energy_eV
    near = np.abs(energy - level.energy_eV) < 20.0 * (level.width_eV + gained)
    assert near.sum() > 12
    exact = stone_lee(level, gained, energy)
    # The widths grow by a factor of e in some 10 meV, which 2e-5 eV off the line begins to show.
    assert spectrum.transmission[near] == pytest.approx(exact[near], rel=1e-3)
    area = np.trapezoid(spectrum.transmission[near], energy[near])
    whole = 2.0 * math.pi * level.left_width_eV * level.right_width_eV / level.width_eV
    assert area == pytest.approx(whole, rel=0.1)
    assert spectrum.reflection == pytest.approx(1.0 - spectrum.transmission)
    plain = scatter(profile, energy)
    far = np.abs(energy - level.energy_eV) > 1e-8
    dwell = plain.dwell_time_s[far]
    assert spectrum.dwell_time_s[far] == pytest.approx(dwell, rel=1e-6, nan_ok=True)


@pytest.mark.parametrize("gamma", [1e-5, 1e-3, 2e-2])
def test_a_straight_line_between_points_is_close(gamma: float) -> None:
    profile = uniform_field(THREE_WELLS, 0.05)
    levels = find_levels(profile, 0.0, 0.3)
    dephasing = Dephasing(gamma, wells_of(THREE_WELLS))
    spectrum = adaptive_spectrum(profile, 0.0, 0.3, levels, dephasing)
    energy = np.linspace(1e-3, 0.299, 5001)
    drawn = np.interp(energy, spectrum.energy_eV, spectrum.log10_transmission)
    exact = scatter_dephased(profile, THREE_WELLS, energy, gamma).log10_transmission
    assert np.abs(drawn - exact).max() < 0.06


def test_sectors_cut_before() -> None:
    profile = uniform_field(TWO_WELLS)
    sectors = cut(profile, 0.0, 0.7, depth_eV=5e-4)
    result = effective_transmission(profile, sectors, ENERGIES, 1e-3, wells_of(TWO_WELLS))
    whole = scatter_dephased(profile, TWO_WELLS, ENERGIES, 1e-3).transmission
    assert result == pytest.approx(whole, rel=1e-10)
    plain = effective_transmission(profile, sectors, ENERGIES, 0.0, wells_of(TWO_WELLS))
    assert plain == pytest.approx(scatter(profile, ENERGIES).transmission, rel=1e-10)


@pytest.mark.parametrize(
    ("edges", "wells"),
    [
        ([0.3], [-1]),
        ([0.0, 0.3, 0.0], [-1, -1, -1]),
        ([0.0, 0.3, 0.0, 0.3, 0.0], [-1, -1, 0, -1, -1]),
        ([0.4, 0.0, 0.3, 0.0, 0.4], [-1, 0, -1, 1, -1]),  # the low barrier parts two wells
        ([0.4, 0.1, 0.0, 0.1, 0.4], [-1, 0, 0, 0, -1]),  # a well in steps is one
        ([0.2, 0.4, 0.2, 0.0, 0.3], [-1, -1, 0, 0, -1]),
        ([0.3, 0.0, 0.0, 0.3, 0.3], [-1, 0, 0, -1, -1]),
        ([0.3, 0.0, 0.2, 0.2, 0.0, 0.3], [-1, 0, -1, -1, 1, -1]),
        ([0.0, -0.1, 0.0, 0.3, 0.0], [-1, 0, -1, -1, -1]),  # a dip in front of the barrier
    ],
)
def test_which_layers_are_wells(edges: list[float], wells: list[int]) -> None:
    structure = stack([(2.0, edge, 0.08) for edge in edges])
    assert list(wells_of(structure)) == wells


def test_a_time_and_a_mobility() -> None:
    """hbar / 1 ps = 0.658 meV; 10,000 cm^2/Vs with 0.067 m0 is 0.381 ps (handbook arithmetic)."""
    assert dephasing_eV(scattering_time_s=1e-12) == pytest.approx(6.582e-4, rel=1e-4)
    width = dephasing_eV(mobility_cm2_Vs=1e4, mass=0.067)
    assert HBAR_EV_S / width == pytest.approx(3.809e-13, rel=1e-3)


@pytest.mark.parametrize(
    ("values", "key"),
    [
        ({}, "scattering_time_s"),
        ({"scattering_time_s": 1e-12, "mobility_cm2_Vs": 1e4, "mass": 0.1}, "scattering_time_s"),
        ({"scattering_time_s": 0.0}, "scattering_time_s"),
        ({"mobility_cm2_Vs": 1e4}, "mass"),
        ({"mobility_cm2_Vs": 0.5, "mass": 0.1}, "mobility_cm2_Vs"),
        ({"mobility_cm2_Vs": 1.0, "mass": 0.067}, "mobility_cm2_Vs"),
    ],
)
def test_what_makes_no_width(values: dict[str, float], key: str) -> None:
    with pytest.raises(StructureError) as caught:
        dephasing_eV(**values)
    assert caught.value.key == key


@pytest.mark.parametrize("gamma", [-1e-3, 1.5, math.nan])
def test_a_width_out_of_range(gamma: float) -> None:
    structure = two_barriers()
    with pytest.raises(StructureError, match="dephasing"):
        scatter_dephased(uniform_field(structure), structure, ENERGIES, gamma)
