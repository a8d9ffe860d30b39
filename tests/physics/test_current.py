"""Currents against a reference of many digits and the closed forms of the limits."""

import math
from dataclasses import replace
from itertools import pairwise

import mpmath as mp
import numpy as np
import pytest

from physics.constants import BOLTZMANN_EV_PER_K, HBAR2_OVER_2M0_EV_NM2
from physics.current import Currents, current_scale, tsu_esaki
from physics.curve import Drive, curve_at
from physics.dephasing import Dephasing, scatter_dephased, wells_of
from physics.errors import StructureError
from physics.family import family_of
from physics.field import uniform_field
from physics.levels import find_levels
from physics.scattering import scatter
from physics.structure import Contact, Structure
from reference import tsu_esaki as reference
from reference.stacks import as_reference, stack, two_barriers

MASS = 0.067


def kT_eV(temperature_K: float) -> float:
    return BOLTZMANN_EV_PER_K * temperature_K


def between(
    structure: Structure, mu: tuple[float, float], temperature_K: float, drop_V: float = 0.0
) -> Currents:
    """Currents of one profile between two Fermi energies."""
    family = family_of([uniform_field(structure, drop_V)])
    left, right = (np.array([energy]) for energy in mu)
    return tsu_esaki(family, left, right, temperature_K, MASS)


def with_electrons(structure: Structure, fermi_eV: float) -> Structure:
    left, right = structure.left, structure.right
    return Structure(
        Contact(left.edge_eV, left.mass, fermi_eV),
        structure.layers,
        Contact(right.edge_eV, right.mass, fermi_eV),
    )


def drive(structure: Structure, temperature_K: float = 300.0) -> Drive:
    return Drive(
        structure,
        temperature_K,
        lambda biases: [uniform_field(structure, bias) for bias in biases.tolist()],
    )


@pytest.mark.parametrize(
    ("barriers", "height", "drop_V", "temperature_K", "narrowest"),
    [
        ((2.0, 5.0, 2.0), 0.3, 0.0, 300.0, 2e-2),
        ((3.0, 5.0, 3.0), 0.3, 0.06, 300.0, 1e-2),
        ((8.0, 6.0, 8.0), 0.3, 0.0, 4.0, 1e-6),
        ((12.0, 6.0, 11.0), 0.3, 0.0, 300.0, 1e-8),
        ((15.0, 6.0, 15.0), 0.35, 0.0, 300.0, 1e-11),
    ],
)
def test_against_many_digits(
    barriers: tuple[float, float, float],
    height: float,
    drop_V: float,
    temperature_K: float,
    narrowest: float,
) -> None:
    """Tsu and Esaki's integral with T by mpmath (`reference.tsu_esaki`)."""
    structure = two_barriers(*barriers, height)
    mu = (0.06, 0.02)
    found = between(structure, mu, temperature_K, drop_V)
    levels = find_levels(uniform_field(structure, drop_V), 1e-6, height + 0.1).levels
    assert min(level.width_eV for level in levels) < narrowest
    top = min(0.06 + 60.0 * kT_eV(temperature_K), height + 25.0 * kT_eV(temperature_K))
    with mp.workdps(30):
        poles = [complex(x.energy_eV, -0.5 * x.width_eV) for x in levels]
        exact = float(
            reference.current(as_reference(structure, drop_V), poles, mu, temperature_K, (0.0, top))
        )
    current, error = found.current_density_A_per_cm2[0], found.error_A_per_cm2[0]
    assert found.reached.all()
    assert current == pytest.approx(exact, rel=1e-8)
    assert abs(current - exact) <= error + 1e-9 * exact  # the reference is good to 1e-9


@pytest.mark.parametrize("temperature_K", [4.0, 30.0])
@pytest.mark.parametrize("barrier_nm", [14.0, 17.0, 30.0])
def test_single_narrow_level(barrier_nm: float, temperature_K: float) -> None:
    """The line of Breit and Wigner, integrated: 2 pi Gamma_L Gamma_R / Gamma times the supply.

    Ricco and Azbel, Phys. Rev. B 29, 1970 (1984), from memory. The Fermi energies lie far above
    the level, so that the supply is their difference.
    """
    structure = two_barriers(barrier_nm, 5.0, barrier_nm, 0.3)
    (level,) = find_levels(uniform_field(structure), 1e-6, 0.28).levels
    low = level.energy_eV + 40.0 * kT_eV(temperature_K)
    found = between(structure, (low + 0.01, low), temperature_K)
    area = 2.0 * math.pi * level.left_width_eV * level.right_width_eV / level.width_eV
    assert found.by_level_A_per_cm2[0, 0] == pytest.approx(
        current_scale(MASS) * area * 0.01, rel=1e-3
    )
    if barrier_nm == 17.0:
        assert level.width_eV < 1e-10


def test_towards_zero_temperature() -> None:
    """A level between the Fermi energies: its line times (mu_L - E_r), as T goes to 0."""
    structure = two_barriers(12.0, 5.0, 12.0)
    (level,) = find_levels(uniform_field(structure), 1e-6, 0.28).levels
    area = 2.0 * math.pi * level.left_width_eV * level.right_width_eV / level.width_eV
    mu = (level.energy_eV + 0.01, level.energy_eV - 0.05)
    found = between(structure, mu, 0.05)
    exact = current_scale(MASS) * area * 0.01
    assert found.by_level_A_per_cm2[0, 0] == pytest.approx(exact, rel=1e-4)


@pytest.mark.parametrize("temperature_K", [250.0, 300.0, 450.0])
def test_thermionic_limit(temperature_K: float) -> None:
    """A* T^2 exp(-(V - mu)/kT), both ways, over a barrier that is wide and smooth.

    O. W. Richardson's law with the effective mass, as S. M. Sze, Physics of Semiconductor Devices,
    2nd ed., sec. 5.4.1, gives it, from memory: A* = 120.17 m/m0 A cm^-2 K^-2. Tunnelling under a
    parabola's top adds the factor x / sin x, x = hbar omega / 2 kT (E. C. Kemble, Phys. Rev. 48,
    549 (1935), integrated; from memory).
    """
    height, half, mu, bias_V = 0.2, 40.0, 0.05, 0.01
    x = np.linspace(-half, half, 81)
    edge = height * (1.0 - (x / half) ** 2)
    layers = [(1.0, float(v), MASS, float(w)) for v, w in pairwise(edge)]
    found = between(stack(layers), (mu, mu - bias_V), temperature_K)
    kT = kT_eV(temperature_K)
    omega = math.sqrt(2.0 * HBAR2_OVER_2M0_EV_NM2 * 2.0 * height / half**2 / MASS)  # eV
    kemble = 0.5 * omega / kT / math.sin(0.5 * omega / kT)
    richardson = 120.17 * MASS * temperature_K**2
    # Richardson's exp with the few per cent that Fermi's statistics takes from Boltzmann's.
    ahead, back = (
        -float(mp.polylog(2, -math.exp((level - height) / kT)).real) for level in (mu, mu - bias_V)
    )
    exact = kemble * richardson * (ahead - back)
    assert found.current_density_A_per_cm2[0] == pytest.approx(exact, rel=5e-3)


def test_fowler_nordheim_slope() -> None:
    """d ln(J/F^2) / d(1/F) = -(4/3) sqrt(2 m) phi^(3/2) / (e hbar) for a triangular barrier.

    R. H. Fowler and L. Nordheim, Proc. R. Soc. A 119, 173 (1928), from memory; phi is measured
    from the Fermi energy. Good to a few per cent, as the prefactor depends on the field. The right
    contact goes on where the barrier ends, so that nothing is reflected behind it.
    """
    height, mu, thickness, mass = 1.2, 0.3, 40.0, MASS
    layers = stack([(thickness, height, mass)]).layers
    structure = Structure(Contact(0.0, mass, mu), layers, Contact(height, mass, mu - height))
    bias = np.array([2.0, 2.1])
    current = curve_at(drive(structure, 4.0), bias).current_density_A_per_cm2
    field = bias / thickness  # eV/nm
    slope = np.diff(np.log(current / field**2))[0] / np.diff(1.0 / field)[0]
    exact = -4.0 / 3.0 * math.sqrt(mass / HBAR2_OVER_2M0_EV_NM2) * (height - mu) ** 1.5
    assert slope == pytest.approx(exact, rel=0.03)


@pytest.mark.parametrize("temperature_K", [4.0, 77.0, 300.0, 600.0])
def test_no_bias_no_current(temperature_K: float) -> None:
    curve = curve_at(drive(with_electrons(two_barriers(), 0.05), temperature_K), np.array([0.0]))
    assert curve.current_density_A_per_cm2[0] == 0.0
    assert curve.reached.all()


@pytest.mark.parametrize("temperature_K", [4.0, 300.0])
def test_mirror_symmetric_design(temperature_K: float) -> None:
    """J(-V) = -J(V)."""
    bias = np.array([1e-6, 1e-3, 0.05, 0.2, 0.45])
    curve = curve_at(
        drive(with_electrons(two_barriers(), 0.05), temperature_K), np.append(bias, -bias)
    )
    current = curve.current_density_A_per_cm2
    assert current == pytest.approx(-current[::-1], rel=1e-7, abs=0.0)


def test_small_bias_is_ohmic() -> None:
    """To rounding, however small the bias: J/V has a limit."""
    structure = with_electrons(two_barriers(), 0.05)
    bias = np.array([1e-9, 1e-6, 1e-4])
    ratio = curve_at(drive(structure), bias).current_density_A_per_cm2 / bias
    assert ratio[0] == pytest.approx(ratio[1], rel=1e-4)
    assert ratio[0] == pytest.approx(ratio[2], rel=1e-2)


def test_one_bias_as_many() -> None:
    """What is computed side by side is what is computed alone."""
    structure = with_electrons(two_barriers(), 0.05)
    bias = np.linspace(-0.3, 0.4, 29)
    together = curve_at(drive(structure), bias).current_density_A_per_cm2
    alone = [
        float(curve_at(drive(structure), np.array([x])).current_density_A_per_cm2[0]) for x in bias
    ]
    assert together == pytest.approx(alone, rel=1e-7)


def test_levels_share_the_current() -> None:
    curve = curve_at(drive(with_electrons(two_barriers(), 0.05)), np.array([0.02, 0.1, 0.3]))
    total = np.nansum(curve.level_current_A_per_cm2, axis=1)
    assert total == pytest.approx(curve.current_density_A_per_cm2, rel=1e-12)
    assert np.all(curve.level_current_A_per_cm2[0, 0] > 0.9 * curve.current_density_A_per_cm2[0])


def test_flat_stack_carries_what_the_contacts_send() -> None:
    """T = 1: J = scale * [F(mu_L) - F(mu_R)], Fermi-Dirac integrals of order 1 by scipy."""
    from scipy.integrate import quad

    structure = stack([(10.0, 0.0, MASS)])
    kT = kT_eV(300.0)
    found = between(structure, (0.05, 0.03), 300.0)
    left, right = (
        quad(lambda x, mu=mu: kT * np.log1p(np.exp((mu - x) / kT)), 0.0, 2.0, epsrel=1e-12)[0]
        for mu in (0.05, 0.03)
    )
    assert found.current_density_A_per_cm2[0] == pytest.approx(
        current_scale(MASS) * (left - right), rel=1e-9
    )


def test_random_stacks_against_an_even_grid() -> None:
    """Random stacks against the trapezoidal rule on two million energies, lines permitting."""
    rng = np.random.default_rng(7)
    kT = kT_eV(200.0)
    for _ in range(6):
        layers = [
            (float(rng.uniform(1.0, 4.0)), float(rng.choice([0.0, 0.25, 0.4])), MASS)
            for _ in range(5)
        ]
        structure = stack(layers)
        drop = float(rng.uniform(-0.2, 0.2))
        profile = uniform_field(structure, drop)
        mu = (0.05, 0.05 - drop)
        found = between(structure, mu, 200.0, drop)
        low = max(profile.contact_edge_eV)
        energy = np.linspace(low, low + 1.2, 400_001)
        supply = kT * (
            np.logaddexp(0.0, (mu[0] - energy) / kT) - np.logaddexp(0.0, (mu[1] - energy) / kT)
        )
        plain = np.trapezoid(scatter(profile, energy).transmission * supply, energy)
        assert found.current_density_A_per_cm2[0] == pytest.approx(
            current_scale(MASS) * plain, rel=2e-5
        )


@pytest.mark.parametrize("width_eV", [1e-13, 1e-9, 1e-6, 1e-4])
def test_lost_coherence_keeps_a_narrow_level_s_current(width_eV: float) -> None:
    """The area under T stays (Stone and Lee, Phys. Rev. Lett. 54, 1196 (1985), from memory)."""
    structure = two_barriers(17.0, 5.0, 17.0)
    (level,) = find_levels(uniform_field(structure), 1e-6, 0.28).levels
    assert level.width_eV < 1e-10
    mu = (level.energy_eV + 0.06, level.energy_eV + 0.05)
    family = family_of([uniform_field(structure)])
    ends = (np.array([x]) for x in mu)
    lost = Dephasing(width_eV, wells_of(structure))
    found = tsu_esaki(family, *ends, 20.0, MASS, dephasing=lost)
    area = 2.0 * math.pi * level.left_width_eV * level.right_width_eV / level.width_eV
    expected = current_scale(MASS) * area * 0.01
    assert found.by_level_A_per_cm2[0, 0] == pytest.approx(expected, rel=0.02)
    assert found.reached.all()


def test_lost_coherence_lowers_the_peak_and_lifts_the_valley() -> None:
    structure = with_electrons(two_barriers(3.0, 5.0, 3.0), 0.03)
    bias = np.linspace(0.0, 0.35, 36)
    plain = curve_at(drive(structure, 77.0), bias).current_density_A_per_cm2
    lost = replace(drive(structure, 77.0), dephasing=Dephasing(5e-3, wells_of(structure)))
    broad = curve_at(lost, bias).current_density_A_per_cm2
    assert broad[0] == 0.0
    assert broad.max() < plain.max()
    top = int(plain.argmax())
    assert np.all(broad[top + 4 : top + 10] > 1.2 * plain[top + 4 : top + 10])


@pytest.mark.parametrize("width_eV", [1e-5, 3e-3])
def test_lost_coherence_against_an_even_grid(width_eV: float) -> None:
    """The trapezoidal rule over what `physics.dephasing` gives at each energy."""
    structure = two_barriers(2.5, 5.0, 3.5)
    drop, mu, kT = 0.08, (0.05, 0.01), kT_eV(200.0)
    profile = uniform_field(structure, drop)
    lost = Dephasing(width_eV, wells_of(structure))
    family = family_of([profile])
    found = tsu_esaki(family, np.array(mu[:1]), np.array(mu[1:]), 200.0, MASS, dephasing=lost)
    energy = np.linspace(0.0, 1.0, 200_001)
    through = scatter_dephased(profile, structure, energy[1:], width_eV).transmission
    supply = kT * (
        np.logaddexp(0.0, (mu[0] - energy) / kT) - np.logaddexp(0.0, (mu[1] - energy) / kT)
    )
    plain = np.trapezoid(np.append(0.0, through) * supply, energy)
    assert found.current_density_A_per_cm2[0] == pytest.approx(
        current_scale(MASS) * plain, rel=2e-5
    )


def test_two_band_current_is_that_of_its_transmission() -> None:
    """The trapezoidal rule over T with a mass that goes with the energy."""
    plain = two_barriers(2.0, 4.0, 2.0)
    layers = tuple(replace(layer, gap_eV=1.4) for layer in plain.layers)
    ends = (replace(side, gap_eV=1.4) for side in (plain.left, plain.right))
    structure = Structure(next(ends), layers, next(ends))
    profile = uniform_field(structure, 0.05, band="kane")
    mu, kT = (0.05, 0.0), kT_eV(300.0)
    found = tsu_esaki(
        family_of([profile]), np.array(mu[:1]), np.array(mu[1:]), 300.0, MASS
    ).current_density_A_per_cm2[0]
    energy = np.linspace(1e-9, 1.2, 100_001)
    supply = kT * (
        np.logaddexp(0.0, (mu[0] - energy) / kT) - np.logaddexp(0.0, (mu[1] - energy) / kT)
    )
    exact = np.trapezoid(scatter(profile, energy).transmission * supply, energy)
    assert found == pytest.approx(current_scale(MASS) * exact, rel=2e-5)
    flat = between(plain, mu, 300.0, 0.05).current_density_A_per_cm2[0]
    assert abs(found / flat - 1.0) > 0.01


def test_no_electrons_no_answer() -> None:
    with pytest.raises(StructureError, match="donors_cm3 or fermi_eV"):
        curve_at(drive(two_barriers()), np.array([0.1]))


def test_two_levels_that_all_but_coincide() -> None:
    """Three equal barriers, very opaque: a pair split by far less than either distance."""
    structure = stack(
        [
            (7.0, 0.3, MASS),
            (5.0, 0.0, MASS),
            (13.0, 0.3, MASS),
            (5.0, 0.0, MASS),
            (7.0, 0.3, MASS),
        ]
    )
    levels = find_levels(uniform_field(structure), 1e-6, 0.28).levels
    assert levels[1].energy_eV - levels[0].energy_eV < 1e-4
    found = between(structure, (0.15, 0.14), 4.0)
    energy = np.concatenate(
        [x.energy_eV + 0.5 * x.width_eV * np.sinh(np.linspace(-14.0, 14.0, 4001)) for x in levels]
    )
    energy = np.unique(np.clip(energy, 1e-6, 0.145))
    through = scatter(uniform_field(structure), energy).transmission
    kT = kT_eV(4.0)
    supply = kT * (
        np.logaddexp(0.0, (0.15 - energy) / kT) - np.logaddexp(0.0, (0.14 - energy) / kT)
    )
    plain = np.trapezoid(through * supply, energy)
    assert found.by_level_A_per_cm2.sum() == pytest.approx(current_scale(MASS) * plain, rel=1e-3)
