"""Masses that go with the energy: closed forms, a reference of 50 digits, conservation laws.

The model is E. O. Kane's, J. Phys. Chem. Solids 1, 249 (1957), for layers as in G. Bastard, Phys.
Rev. B 24, 5693 (1981), and D. F. Nelson, R. C. Miller and D. A. Kleinman, Phys. Rev. B 35, 7770
(1987): all from memory. m(E) = m (1 + (E - V) / Eg).
"""

from __future__ import annotations

import math
from dataclasses import replace

import mpmath as mp
import numpy as np
import pytest
import scipy.optimize
from hypothesis import given, settings
from hypothesis import strategies as st

from physics.band import masses_of
from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C
from physics.constants import HBAR_EV_S
from physics.errors import EnergyError, StructureError
from physics.field import Profile, uniform_field
from physics.levels import find_levels
from physics.scattering import scatter
from physics.sectors import cut, matrices
from physics.structure import Contact, Layer, Structure
from physics.wavefunction import level_state, local_density_of_states, scattering_state
from reference import integrated, many_digits
from reference.stacks import as_reference, two_barriers

GAAS, BARRIER = (0.067, 1.42), (0.092, 1.8)


def narrow_gap(
    layers: list[tuple[float, ...]],
    left: tuple[float, ...] = (0.0, *GAAS),
    right: tuple[float, ...] = (0.0, *GAAS),
) -> Structure:
    """Layers as (thickness, edge, mass, gap) and at the right face (edge, mass, gap)."""

    def layer(d: float, v: float, m: float, gap: float, *to: float) -> Layer:
        names = ("to_edge_eV", "to_mass", "to_gap_eV")
        return Layer(d, v, m, gap_eV=gap, **dict(zip(names, to, strict=False)))

    first, last = (Contact(edge, mass, gap_eV=gap) for edge, mass, gap in (left, right))
    return Structure(first, tuple(layer(*values) for values in layers), last)


def two(first: float = 2.0, well: float = 5.0, second: float = 2.0) -> Structure:
    return narrow_gap([(first, 0.3, *BARRIER), (well, 0.0, *GAAS), (second, 0.3, *BARRIER)])


TRIED = {
    "two barriers": (two(), 0.0),
    "biased": (two(3.0, 6.0, 4.0), 0.1),
    "backward bias": (two(3.0, 6.0, 4.0), -0.2),
    "small gaps": (
        narrow_gap(
            [(3.0, 0.52, 0.075, 1.5), (6.0, 0.0, 0.023, 0.36), (3.0, 0.52, 0.075, 1.5)],
            (0.0, 0.043, 0.74),
            (0.0, 0.043, 0.74),
        ),
        0.15,
    ),
    "graded edge": (narrow_gap([(4.0, 0.1, *BARRIER, 0.4), (3.0, 0.4, 0.1, 2.0, 0.0)]), 0.1),
    "graded in all": (
        narrow_gap([(4.0, 0.0, *GAAS, 0.3, 0.12, 2.5), (3.0, 0.3, 0.12, 2.5, 0.1, 0.05, 0.6)]),
        -0.1,
    ),
    "unlike contacts": (
        narrow_gap(
            [(3.0, 0.3, 0.1, 1.1), (8.0, 0.0, 0.05, 0.7), (2.0, 0.4, 0.1, 2.0)],
            (0.0, 0.03, 0.5),
            (-0.1, 0.15, 3.0),
        ),
        0.0,
    ),
    "three barriers": (
        narrow_gap([(3.0, 0.3, *BARRIER), (6.0, 0.0, *GAAS)] * 2 + [(3.0, 0.3, *BARRIER)]),
        0.0,
    ),
    "one contact closed": (
        narrow_gap([(7.0, 0.0, *GAAS), (3.0, 0.3, *BARRIER)], (0.4, *BARRIER)),
        0.0,
    ),
}


def kane(structure: Structure, bias_V: float = 0.0) -> Profile:
    return uniform_field(structure, bias_V, band="kane")


@pytest.mark.parametrize("name", TRIED)
def test_transmission_against_the_reference(name: str) -> None:
    structure, bias = TRIED[name]
    profile = kane(structure, bias)
    lowest = max(profile.contact_edge_eV)
    energies = [lowest + above for above in (1e-6, 0.013, 0.0797, 0.21, 0.3, 0.9, 1.9)]
    result = scatter(profile, np.array(energies))
    for n, energy in enumerate(energies):
        exact, reflected = many_digits.transmission(as_reference(structure, bias), energy)
        assert float(result.transmission[n]) == pytest.approx(float(exact), rel=1e-12)
        assert float(result.reflection[n]) == pytest.approx(float(reflected), abs=1e-13)
    assert np.abs(result.transmission + result.reflection - 1.0).max() < 1e-13


@pytest.mark.parametrize("name", TRIED)
def test_levels_against_the_reference(name: str) -> None:
    """Poles at 50 digits: the energies and, from the flux over the two-band norm, the widths."""
    structure, bias = TRIED[name]
    profile = kane(structure, bias)
    found = find_levels(profile, profile.lowest_eV, 0.3, 0.2)
    assert found.complete
    assert found.counted == len(found.levels)
    assert found.levels or name.startswith("graded")
    for level in found.levels:
        guess = complex(level.energy_eV, -0.5 * level.width_eV)
        exact = many_digits.pole(as_reference(structure, bias), guess)
        assert level.energy_eV == pytest.approx(float(mp.re(exact)), abs=4e-15)
        assert level.width_eV == pytest.approx(float(-2 * mp.im(exact)), rel=1e-10)


@pytest.mark.parametrize("name", ["two barriers", "biased", "small gaps", "three barriers"])
def test_none_missed_and_none_invented(name: str) -> None:
    """The argument principle on an outgoing-wave condition integrated by scipy."""
    structure, bias = TRIED[name]
    window = (0.004, 0.297)
    found = find_levels(kane(structure, bias), *window, 0.06)
    counted = integrated.count_poles(as_reference(structure, bias), *window, 0.06)
    assert found.complete
    assert found.counted == len(found.levels) == counted


def test_widths_far_below_rounding() -> None:
    structure = two(50.0, 4.0, 55.0)
    level = find_levels(kane(structure), 0.0, 0.2).levels[0]
    assert level.width_eV < 1e-20
    with mp.workdps(150):
        exact = many_digits.pole(as_reference(structure), complex(level.energy_eV, 0.0))
        assert level.width_eV == pytest.approx(float(-2 * mp.im(exact)), rel=1e-10)


@settings(max_examples=25, deadline=None)
@given(
    edges=st.tuples(*[st.floats(-0.5, 0.5)] * 2),
    masses=st.tuples(*[st.floats(0.02, 0.3)] * 2),
    gaps=st.tuples(*[st.floats(2.0, 6.0)] * 2),
    thickness=st.floats(0.2, 6.0),
    energy_eV=st.tuples(st.floats(-0.9, 2.1), st.floats(0.0, 0.4)),
)
def test_the_matrix_of_a_layer(
    edges: tuple[float, float],
    masses: tuple[float, float],
    gaps: tuple[float, float],
    thickness: float,
    energy_eV: tuple[float, float],
) -> None:
    """All graded, real and complex energies: rounding of 1e-13 against 50 digits."""
    layer = (thickness, edges[0], masses[0], gaps[0], edges[1], masses[1], gaps[1])
    structure = narrow_gap([layer])
    profile = kane(structure)
    energy = np.array([complex(energy_eV[0], -energy_eV[1])])
    total = np.eye(2, dtype=complex)
    for _, (a, b, c, d) in matrices(cut(profile, -0.9, 2.1, depth_eV=0.4), energy, forward=True):
        total = np.array([[a[0], b[0]], [c[0], d[0]]]) @ total
    exact = many_digits.whole_matrix(as_reference(structure), mp.mpc(energy[0]))
    scale = np.array([[1.0, 10.0], [0.1, 1.0]])  # f in units of 0.1 eV nm, about c k / m
    there = np.array([[complex(exact[i, j]) for j in (0, 1)] for i in (0, 1)])
    assert np.abs((total - there) * scale).max() < 1e-13 * np.abs(there * scale).max()


def test_finite_well_in_closed_form() -> None:
    """(k / mw) tan(k L / 2) = q / mb, or -cot, with both masses at the energy (Nelson et al.)."""
    depth, width, (mw, gw), (mb, gb) = 0.5, 12.0, (0.041, 0.75), (0.075, 1.5)
    outside = (depth, mb, gb)
    found = find_levels(kane(narrow_gap([(width, 0.0, mw, gw)], outside, outside)), 0.0, depth)

    def phase(energy: float) -> float:
        well, barrier = mw * (1 + energy / gw), mb * (1 + (energy - depth) / gb)
        k = math.sqrt(well * energy / C)
        q = math.sqrt(barrier * (depth - energy) / C)
        return k * width - 2.0 * math.atan2(q / barrier, k / well)

    assert found.complete
    assert len(found.levels) == 1 + math.floor(phase(depth) / math.pi) > 2
    for n, level in enumerate(found.levels):
        expected = scipy.optimize.brentq(lambda e, n=n: phase(e) - n * math.pi, 1e-9, depth)
        assert level.energy_eV == pytest.approx(expected, abs=2e-12)
        assert (level.kind, level.nodes) == ("bound", n)


@pytest.mark.parametrize("n", [1, 2, 3])
def test_nothing_is_reflected_where_the_layer_holds_half_waves(n: int) -> None:
    """k L = n pi: E (1 + E / Eg) = c (n pi / L)^2 / m, the energies of a box with hard walls."""
    width, mass, gap = 9.0, 0.023, 0.36
    structure = narrow_gap([(width, 0.0, mass, gap)], (-0.3, 0.06, 0.9), (-0.3, 0.06, 0.9))
    plain = C * (n * math.pi / width) ** 2 / mass
    energy = 0.5 * gap * (math.sqrt(1.0 + 4.0 * plain / gap) - 1.0)
    assert energy < 0.8 * plain
    result = scatter(kane(structure), np.array([energy]))
    assert float(result.transmission[0]) == pytest.approx(1.0, abs=1e-13)
    assert float(result.reflection[0]) < 1e-25


def free_speed_nm_s(energy: float, mass: float, gap: float) -> float:
    """dE / (hbar dk) from E (1 + E / Eg) = c k^2 / m."""
    k = math.sqrt(mass * energy * (1.0 + energy / gap) / C)
    return 2.0 * C * k / (mass * (1.0 + 2.0 * energy / gap)) / HBAR_EV_S


def test_free_electrons() -> None:
    """They dwell L / v and have 1 / (pi hbar v) states per spin, with the two-band velocity."""
    mass, gap, energy = 0.023, 0.36, 0.27
    alike = (0.0, mass, gap)
    profile = kane(narrow_gap([(7.0, *alike)], alike, alike))
    speed = free_speed_nm_s(energy, mass, gap)
    dwell = float(scatter(profile, np.array([energy])).dwell_time_s[0])
    assert dwell == pytest.approx(7.0 / speed, rel=1e-12)
    states = local_density_of_states(profile, np.linspace(0.0, 7.0, 5), np.array([energy]))
    assert states == pytest.approx(1.0 / (np.pi * HBAR_EV_S * speed), rel=1e-12)
    density = scattering_state(profile, energy).density_per_nm
    assert density == pytest.approx(1.0, rel=1e-12)


def test_dwell_time_is_the_density_over_the_flux() -> None:
    """Both components of the wave, by quadrature layer by layer (F. T. Smith's definition)."""
    structure, bias = TRIED["small gaps"]
    profile = kane(structure, bias)
    energy = 0.2
    state = scattering_state(profile, energy, 30_000)
    steps = np.diff(state.x_nm)
    middle = 0.5 * (state.density_per_nm[1:] + state.density_per_nm[:-1])
    inside = float((middle * steps).sum())
    speed = free_speed_nm_s(energy, 0.043, 0.74)
    dwell = float(scatter(profile, np.array([energy])).dwell_time_s[0])
    assert dwell == pytest.approx(inside / speed, rel=3e-4)  # the density steps at interfaces


def test_a_level_holds_one_electron_and_its_line_as_many_states() -> None:
    profile = kane(two(5.0, 5.0, 5.0))
    level = find_levels(profile, 0.05, 0.15).levels[0]
    state = level_state(profile, level, 20_000)
    assert np.trapezoid(state.density_per_nm, state.x_nm) == pytest.approx(1.0, rel=1e-4)
    theta, weight = np.polynomial.legendre.leggauss(60)
    theta, weight = theta * 1.55, weight * 1.55
    energy = level.energy_eV + 0.5 * level.width_eV * np.tan(theta)
    x = np.array([6.1, 7.5, 9.0])
    slope = 0.5 * level.width_eV / np.cos(theta) ** 2
    states = local_density_of_states(profile, x, energy)
    integral = (states * slope * weight).sum(axis=1) * np.pi / (2.0 * 1.55)
    assert integral == pytest.approx(np.interp(x, state.x_nm, state.density_per_nm), rel=1e-2)


def test_mirrored_and_reversed() -> None:
    """T is the same from either side (time reversal); poles too, with the widths exchanged."""
    structure, _ = TRIED["unlike contacts"]
    profile = kane(structure)
    mirrored = kane(Structure(structure.right, structure.layers[::-1], structure.left))
    energy = np.linspace(0.01, 1.0, 40)
    there, back = scatter(profile, energy), scatter(mirrored, energy)
    assert back.transmission == pytest.approx(there.transmission, rel=1e-12)
    assert back.transmitted_phase_rad == pytest.approx(there.transmitted_phase_rad, abs=1e-11)
    levels, others = (find_levels(p, 0.01, 0.3).levels for p in (profile, mirrored))
    assert len(levels) == len(others) >= 1
    for one, other in zip(levels, others, strict=True):
        assert one.energy_eV == pytest.approx(other.energy_eV, abs=1e-14)
        assert one.left_width_eV == pytest.approx(other.right_width_eV, rel=1e-11)


def test_without_slopes_all_is_as_it_was() -> None:
    """Gaps alone change nothing; a slope of 1e-300 takes the longer way to the same numbers."""
    plain = uniform_field(two_barriers(), 0.1)
    stated = uniform_field(two(), 0.1)
    tiny = np.full(3, 1e-300)
    longer = replace(plain, mass_slope_left=tiny, mass_slope_right=tiny)
    assert plain.is_parabolic
    assert stated.is_parabolic
    assert not longer.is_parabolic
    energy = np.linspace(0.001, 0.9, 50)
    one, two_, three = (scatter(p, energy).transmission for p in (plain, stated, longer))
    assert (one == two_).all()
    assert three == pytest.approx(one, rel=1e-13)
    a, b = (find_levels(p, 0.0, 0.3).levels for p in (plain, longer))
    assert [x.width_eV for x in b] == pytest.approx([x.width_eV for x in a], rel=1e-12)


def test_pieces_of_layers_are_the_layers() -> None:
    """As a solver of the field would lay them: many linear pieces a layer."""
    structure, bias = TRIED["graded in all"]
    whole = kane(structure, bias)
    count, layer = 5, np.repeat([0, 1], 5)
    start = np.tile(np.arange(count) / count, 2)
    stop = np.tile(np.arange(1, count + 1) / count, 2)
    masses = masses_of(structure, "kane").pieces(layer, start, stop)
    rise = (whole.edge_right_eV - whole.edge_left_eV)[layer]
    thickness = whole.thickness_nm[layer] / count
    fine = Profile(
        position_nm=np.append(0.0, np.cumsum(thickness)),
        thickness_nm=thickness,
        edge_left_eV=whole.edge_left_eV[layer] + rise * start,
        edge_right_eV=whole.edge_left_eV[layer] + rise * stop,
        mass_left=masses.left,
        mass_right=masses.right,
        mass_slope_left=masses.slope_left,
        mass_slope_right=masses.slope_right,
        layer_index=layer,
        contact_edge_eV=whole.contact_edge_eV,
        contact_mass=masses.contact,
        contact_mass_slope=masses.contact_slope,
    )
    energy = np.linspace(0.11, 1.0, 20)
    expected = scatter(whole, energy).transmission
    assert scatter(fine, energy).transmission == pytest.approx(expected, rel=1e-12)


def test_a_spacer_is_the_contact_only_if_its_gap_is() -> None:
    barriers = list(two(3.0).layers)
    like, unlike = (Layer(20.0, 0.0, 0.067, gap_eV=gap) for gap in (1.42, 0.5))
    plain = find_levels(kane(two(3.0)), 0.0, 0.3).levels
    contact = Contact(0.0, 0.067, gap_eV=1.42)
    spaced = Structure(contact, (like, *barriers, like), contact)
    assert [level.energy_eV for level in find_levels(kane(spaced), 0.0, 0.3).levels] == (
        pytest.approx([level.energy_eV for level in plain], abs=1e-13)
    )
    other = Structure(contact, (unlike, *barriers, unlike), contact)
    level = find_levels(kane(other), 0.05, 0.15).levels[0]
    guess = complex(level.energy_eV, -0.5 * level.width_eV)
    exact = many_digits.pole(as_reference(other), guess)
    assert level.width_eV == pytest.approx(float(-2 * mp.im(exact)), rel=1e-10)


def test_a_missing_gap_is_refused() -> None:
    structure = two()
    layers = (structure.layers[0], replace(structure.layers[1], gap_eV=None), structure.layers[2])
    for broken, where in (
        (replace(structure, layers=layers), "layer 2"),
        (replace(structure, left=Contact(0.0, 0.067)), "left"),
        (replace(structure, right=Contact(0.0, 0.067)), "right"),
    ):
        assert uniform_field(broken).is_parabolic
        with pytest.raises(StructureError, match="take band = parabolic") as caught:
            kane(broken)
        assert (caught.value.where, caught.value.key) == (where, "gap_eV")
    with pytest.raises(StructureError, match="parabolic or kane"):
        uniform_field(structure, band="other")


@pytest.mark.parametrize("gap", [0.0, -1.0, 21.0, math.nan])
def test_gaps_are_checked(gap: float) -> None:
    for key in ("gap_eV", "to_gap_eV"):
        with pytest.raises(StructureError, match=key):
            replace(two(), layers=(Layer(1.0, 0.0, 0.067, **{key: gap}),))
    with pytest.raises(StructureError, match="right: gap_eV"):
        replace(two(), right=Contact(0.0, 0.067, gap_eV=gap))


def test_valence_bands_are_refused() -> None:
    """Where m(E) <= 0; the refusal says where and which energies are allowed."""
    profile = kane(
        narrow_gap([(3.0, 1.0, 0.08, 1.2), (5.0, -0.3, 0.03, 0.4), (3.0, 1.0, 0.08, 1.2)])
    )
    said = r"layer 1: -0.25 eV .* from -0.1999 eV on are allowed"
    for ask in (
        lambda: scatter(profile, np.array([-0.25, 0.1])),
        lambda: find_levels(profile, -0.25, 0.1),
        lambda: scattering_state(profile, -0.25),
        lambda: local_density_of_states(profile, np.array([1.0]), np.array([-0.25])),
    ):
        with pytest.raises(EnergyError, match=said):
            ask()
    contact = kane(narrow_gap([(3.0, 0.0, *GAAS)], (0.3, 0.03, 0.2)))
    with pytest.raises(EnergyError, match=r"left: 0.05 eV .* from 0\.1(001)? eV on"):
        find_levels(contact, 0.05, 0.2)
    graded = kane(narrow_gap([(3.0, 0.0, 0.1, 2.0, 1.0, 0.1, 0.5)]))
    with pytest.raises(EnergyError, match=r"layer 1: 0.4 eV .* from 0.5(001)? eV on"):
        scatter(graded, np.array([0.4]))


def test_a_window_may_begin_just_above_a_valence_band() -> None:
    """The margin that starting points come from is cut there instead of refused."""
    profile = kane(narrow_gap([(3.0, 0.6, 0.08, 0.7), (5.0, 0.0, *GAAS), (3.0, 0.6, 0.08, 0.7)]))
    found = find_levels(profile, -0.0999, 0.5)
    assert found.complete
    wide = find_levels(profile, 0.0, 0.5)
    assert [level.energy_eV for level in found.levels] == pytest.approx(
        [level.energy_eV for level in wide.levels], abs=1e-13
    )


def test_the_top_of_a_valence_band_inside_a_graded_layer() -> None:
    """V - m / b is largest inside where both go against each other: by brute force."""
    profile = kane(
        narrow_gap([(3.0, 0.0, 0.1, 3.0, -2.0, 0.1, 0.5)], (0.0, 0.05, 3.0), (-2.0, 0.05, 3.0))
    )
    s = np.linspace(0.0, 1.0, 200_001)
    top = float((-2.0 * s - 0.1 / (0.1 / 3.0 + (0.1 / 0.5 - 0.1 / 3.0) * s)).max())
    assert -1.7909 < top < -1.7908
    with pytest.raises(EnergyError, match=r"layer 1: .* from -1\.7908 eV on"):
        scatter(profile, np.array([top - 1e-6]))
    assert np.isfinite(scatter(profile, np.array([top + 1e-6])).reflection[0])
