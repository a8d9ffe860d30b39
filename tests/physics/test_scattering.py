"""T, R, phases and dwell time against closed forms, a reference of many digits, and symmetries."""

from __future__ import annotations

import math
from dataclasses import replace

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import airy

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C
from physics.constants import HBAR_EV_S
from physics.field import uniform_field
from physics.scattering import scatter
from physics.structure import Contact, Layer, Structure
from physics.wavefunction import scattering_state
from reference import many_digits
from reference.stacks import as_reference, stack, two_barriers

TRIED = {
    "two barriers": (two_barriers(), 0.0),
    "biased two barriers": (two_barriers(3.0, 6.0, 4.0), 0.1),
    "backward bias": (two_barriers(3.0, 6.0, 4.0), -0.2),
    "opaque": (stack([(40.0, 1.0, 0.2), (5.0, 0.0, 0.067), (30.0, 1.0, 0.2)]), 0.05),
    "graded edge": (stack([(4.0, 0.1, 0.08, 0.4), (3.0, 0.4, 0.1, 0.0)]), 0.1),
    "graded edge and mass": (stack([(4.0, 0.0, 0.067, 0.3, 0.12), (3.0, 0.3, 0.12)]), -0.1),
    "unlike contacts": (stack([(3.0, 0.3, 0.1)], (0.0, 0.03), (-0.2, 0.15)), 0.0),
}


@pytest.mark.parametrize("name", TRIED)
def test_against_the_reference(name: str) -> None:
    structure, bias = TRIED[name]
    profile = uniform_field(structure, bias)
    lowest = max(profile.contact_edge_eV)
    energies = [lowest + above for above in (1e-6, 0.013, 0.0797, 0.21, 0.3, 0.9, 1.9)]
    result = scatter(profile, np.array(energies))
    for n, energy in enumerate(energies):
        # The reference multiplies growing matrices: an opaque stack eats digits.
        with mp.workdps(450 if name == "opaque" else many_digits.DIGITS):
            exact, exact_reflection = many_digits.transmission(
                as_reference(structure, bias), energy
            )
        log10 = float(mp.log10(exact))
        assert float(result.log10_transmission[n]) == pytest.approx(log10, abs=1e-11)
        if exact > mp.mpf(10) ** -300:
            assert float(result.transmission[n]) == pytest.approx(float(exact), rel=1e-11)
        assert float(result.reflection[n]) == pytest.approx(float(exact_reflection), abs=1e-12)


def test_exactly_at_a_band_edge() -> None:
    """E = V in a flat layer: psi is linear, T = 4 / (4 + (k d)^2) for one mass (closed form)."""
    energy, d, mass = 0.3, 5.0, 0.067
    result = scatter(uniform_field(stack([(d, energy, mass)])), np.array([energy]))
    k = math.sqrt(mass * energy / C)
    assert float(result.transmission[0]) == pytest.approx(4.0 / (4.0 + (k * d) ** 2), rel=1e-13)


def test_below_the_smallest_double() -> None:
    """T of an opaque barrier: 16 (k q / (k^2 + q^2))^2 exp(-2 q d) (closed form, deep limit)."""
    d, height, mass, energy = 2000.0, 1.0, 0.2, 0.3
    structure = stack([(d, height, mass)], (0.0, mass), (0.0, mass))
    result = scatter(uniform_field(structure), np.array([energy]))
    k, q = math.sqrt(mass * energy / C), math.sqrt(mass * (height - energy) / C)
    expected = 2.0 * math.log10(4.0 * k * q / (k * k + q * q)) - 2.0 * q * d / math.log(10.0)
    assert expected < -3000.0
    assert float(result.log10_transmission[0]) == pytest.approx(expected, rel=1e-13)
    assert float(result.transmission[0]) == 0.0


def test_closed_contacts() -> None:
    profile = uniform_field(two_barriers(), -0.1)  # the right contact's edge lies at 0.1 eV
    result = scatter(profile, np.array([-0.05, 0.0, 0.05, 0.1, 0.2]))
    assert result.transmission[:4].tolist() == [0.0] * 4
    assert result.reflection[:4].tolist() == [1.0] * 4
    assert np.isneginf(result.log10_transmission[:4]).all()
    assert np.isnan(result.dwell_time_s[:2]).all()
    assert result.dwell_time_s[2] > 0.0  # comes in from the left and goes back
    assert np.isfinite(result.reflected_phase_rad[2])
    assert result.transmission[4] > 0.0


def test_phase_of_free_flight() -> None:
    """Without a barrier the wave only gains k L, and dwells L / v (kinematics)."""
    length, mass, energy = 7.0, 0.067, 0.11
    result = scatter(uniform_field(stack([(length, 0.0, mass)])), np.array([energy]))
    k = math.sqrt(mass * energy / C)
    velocity = 2.0 * C * k / mass / HBAR_EV_S
    assert float(result.transmitted_phase_rad[0]) == pytest.approx(k * length, rel=1e-12)
    assert float(result.dwell_time_s[0]) == pytest.approx(length / velocity, rel=1e-12)
    assert float(result.transmission[0]) == pytest.approx(1.0, abs=1e-14)


def test_reflected_phase_of_a_wall() -> None:
    """A high step: r = (k - i q) / (k + i q) for one mass (closed form)."""
    energy, height, mass = 0.1, 0.6, 0.067
    structure = stack([(5.0, height, mass)], (0.0, mass), (height, mass))
    result = scatter(uniform_field(structure), np.array([energy]))
    expected = -2.0 * math.atan2(math.sqrt(height - energy), math.sqrt(energy))
    assert float(result.reflected_phase_rad[0]) == pytest.approx(expected, rel=1e-12)


def test_dwell_time_is_the_integral_of_the_density() -> None:
    profile = uniform_field(two_barriers(), 0.07)
    energy = 0.0431
    result = scatter(profile, np.array([energy]))
    state = scattering_state(profile, energy, 20_000)
    velocity = 2.0 * math.sqrt(C * energy / 0.067) / HBAR_EV_S
    integral = np.trapezoid(state.density_per_nm, state.x_nm)
    assert float(result.dwell_time_s[0]) == pytest.approx(integral / velocity, rel=1e-7)


def test_resonance_of_a_symmetric_stack_is_full() -> None:
    """Mirror symmetry makes T = 1 at each level (B. Ricco and M. Azbel, PRB 29, 1970 (1984))."""
    profile = uniform_field(two_barriers(4.0, 5.0, 4.0))
    energies = np.linspace(0.0817, 0.0819, 20_001)
    assert scatter(profile, energies).transmission.max() == pytest.approx(1.0, abs=1e-4)


edges = st.floats(-0.2, 1.0)
masses = st.floats(0.02, 0.5)
layers = st.builds(
    Layer,
    thickness_nm=st.floats(0.2, 12.0),
    edge_eV=edges,
    mass=masses,
    to_edge_eV=st.none() | edges,
    to_mass=st.none() | masses,
)
stacks = st.builds(
    Structure,
    left=st.builds(Contact, edge_eV=st.just(0.0), mass=masses),
    layers=st.lists(layers, min_size=1, max_size=8).map(tuple),
    right=st.builds(Contact, edge_eV=st.floats(-0.3, 0.3), mass=masses),
)
ENERGIES = np.array([0.013, 0.21, 0.45, 0.7321, 1.3])


@settings(max_examples=150, deadline=None)
@given(stacks, st.floats(-0.3, 0.3))
def test_flux_is_conserved(structure: Structure, bias: float) -> None:
    result = scatter(uniform_field(structure, bias), ENERGIES)
    assert np.abs(result.transmission + result.reflection - 1.0).max() < 1e-12


def turned(structure: Structure) -> Structure:
    """The same stack seen from the other side."""
    mirrored = tuple(
        replace(
            layer,
            edge_eV=layer.right_edge_eV,
            mass=layer.right_mass,
            to_edge_eV=layer.edge_eV,
            to_mass=layer.mass,
        )
        for layer in reversed(structure.layers)
    )
    return Structure(structure.right, mirrored, structure.left)


@settings(max_examples=80, deadline=None)
@given(stacks)
def test_reciprocity(structure: Structure) -> None:
    there = scatter(uniform_field(structure), ENERGIES)
    back = scatter(uniform_field(turned(structure)), ENERGIES)
    assert there.log10_transmission == pytest.approx(back.log10_transmission, rel=1e-9, abs=1e-9)


@settings(max_examples=80, deadline=None)
@given(stacks, st.integers(0, 7), st.floats(0.1, 0.9))
def test_splitting_a_layer_changes_nothing(structure: Structure, n: int, share: float) -> None:
    n %= len(structure.layers)
    layer = structure.layers[n]
    edge = layer.edge_eV * (1.0 - share) + layer.right_edge_eV * share
    mass = layer.mass * (1.0 - share) + layer.right_mass * share
    first = replace(layer, thickness_nm=layer.thickness_nm * share, to_edge_eV=edge, to_mass=mass)
    second = replace(
        layer,
        thickness_nm=layer.thickness_nm * (1.0 - share),
        edge_eV=edge,
        mass=mass,
        to_edge_eV=layer.right_edge_eV,
        to_mass=layer.right_mass,
    )
    split = replace(
        structure, layers=(*structure.layers[:n], first, second, *structure.layers[n + 1 :])
    )
    whole, parts = (scatter(uniform_field(s, 0.05), ENERGIES) for s in (structure, split))
    assert whole.log10_transmission == pytest.approx(parts.log10_transmission, rel=1e-9, abs=1e-9)


@settings(max_examples=80, deadline=None)
@given(stacks, st.floats(-1.0, 1.0))
def test_shifting_edges_and_energy_changes_nothing(structure: Structure, shift: float) -> None:
    moved = Structure(
        replace(structure.left, edge_eV=structure.left.edge_eV + shift),
        tuple(
            replace(
                layer,
                edge_eV=layer.edge_eV + shift,
                to_edge_eV=None if layer.to_edge_eV is None else layer.to_edge_eV + shift,
            )
            for layer in structure.layers
        ),
        replace(structure.right, edge_eV=structure.right.edge_eV + shift),
    )
    here = scatter(uniform_field(structure), ENERGIES)
    there = scatter(uniform_field(moved), ENERGIES + shift)
    assert here.log10_transmission == pytest.approx(there.log10_transmission, rel=1e-8, abs=1e-8)


def test_a_thousand_layers() -> None:
    """500 periods against the Chebyshev closed form (F. Abeles, Ann. Phys. 5, 596 (1950))."""
    period = stack([(5.0, 0.0, 0.067), (2.0, 0.3, 0.092)])
    structure = stack([(5.0, 0.0, 0.067), (2.0, 0.3, 0.092)] * 500)
    energies = np.array([0.02, 0.0700001, 0.09])
    result = scatter(uniform_field(structure), energies)
    for n, energy in enumerate(energies):
        one = many_digits.whole_matrix(as_reference(period), mp.mpf(energy))
        half_trace = mp.re(one[0, 0] + one[1, 1]) / 2
        u = [mp.chebyu(k, half_trace) for k in (499, 498)]
        big = u[0] * one - u[1] * mp.eye(2)
        q = mp.sqrt(many_digits.constant() / mp.mpf(0.067) * energy)
        t = 4 / ((big[0, 0] + big[1, 1]) ** 2 + (big[0, 1] * q - big[1, 0] / q) ** 2)
        assert float(result.log10_transmission[n]) == pytest.approx(
            float(mp.log10(mp.re(t))), abs=1e-9
        )


def test_triangular_barrier() -> None:
    """A barrier falling linearly to zero, by Airy functions (scipy; R. H. Fowler and L. Nordheim).

    Proc. R. Soc. A 119, 173 (1928) give the matching; psi and psi'/m are continuous.
    """
    height, d, mass, energy = 0.4, 6.0, 0.067, 0.13
    force = -height / d
    beta = -float(np.cbrt(-force * mass / C))
    z = beta * (np.array([height, 0.0]) - energy) / force
    ai, aip, bi, bip = airy(z)
    k = math.sqrt(mass * energy / C)
    # psi = p Ai + q Bi inside; transmitted wave 1 at x = d: psi = 1, psi' = i k.
    p, q = np.linalg.solve([[ai[1], bi[1]], [beta * aip[1], beta * bip[1]]], [1.0, 1j * k])
    psi, slope = p * ai[0] + q * bi[0], beta * (p * aip[0] + q * bip[0])
    incident = 0.5 * (psi + slope / (1j * k))
    structure = stack([(d, height, mass, 0.0)])
    result = scatter(uniform_field(structure), np.array([energy]))
    assert float(result.transmission[0]) == pytest.approx(1.0 / abs(incident) ** 2, rel=1e-11)


def test_many_energies_are_the_same_as_few() -> None:
    profile = uniform_field(two_barriers(), 0.1)
    energy = np.linspace(0.001, 0.3, 140_000)
    whole = scatter(profile, energy)
    some = scatter(profile, np.concatenate([energy[:1], energy[65_000:66_000], energy[-1:]]))
    picked = np.concatenate([[0], np.arange(65_000, 66_000), [energy.size - 1]])
    assert whole.transmission[picked] == pytest.approx(some.transmission, rel=1e-12)
    assert whole.dwell_time_s[picked] == pytest.approx(some.dwell_time_s, rel=1e-12)
