"""Levels against a reference of 50 digits, closed forms, counts and conservation laws."""

from __future__ import annotations

import math

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C
from physics.constants import HBAR_EV_S
from physics.errors import EnergyError, StructureError
from physics.field import uniform_field
from physics.levels import find_levels, follow_levels
from physics.ranges import THICKNESS_NM
from physics.scattering import scatter
from physics.structure import Structure
from reference import integrated, many_digits
from reference.stacks import as_reference, stack, two_barriers

TRIED: dict[str, tuple[Structure, float]] = {
    "two barriers": (two_barriers(), 0.0),
    "biased": (two_barriers(3.0, 6.0, 4.0), 0.1),
    "narrow": (two_barriers(9.0, 5.0, 12.0), 0.0),
    "very narrow": (two_barriers(25.0, 5.0, 30.0, 0.8), 0.0),
    "unlike contacts": (
        stack([(3.0, 0.3, 0.1), (8.0, 0.0, 0.05), (2.0, 0.4, 0.1)], (0.0, 0.03), (-0.1, 0.15)),
        0.0,
    ),
    "graded well": (
        stack([(4.0, 0.35, 0.1), (9.0, 0.0, 0.06, 0.12, 0.075), (4.0, 0.35, 0.1)]),
        0.05,
    ),
    "three barriers": (
        stack([(3.0, 0.3, 0.09), (6.0, 0.0, 0.067)] * 2 + [(3.0, 0.3, 0.09)]),
        0.0,
    ),
    "one contact closed": (stack([(7.0, 0.0, 0.067), (3.0, 0.3, 0.09)], (0.4, 0.09)), 0.0),
}


@pytest.mark.parametrize("name", TRIED)
def test_against_the_reference(name: str) -> None:
    structure, bias = TRIED[name]
    profile = uniform_field(structure, bias)
    found = find_levels(profile, profile.lowest_eV, 0.3)
    assert found.complete
    assert found.counted == len(found.levels) >= 1
    with mp.workdps(120 if name == "very narrow" else many_digits.DIGITS):
        for level in found.levels:
            guess = complex(level.energy_eV, -0.5 * level.width_eV)
            exact = many_digits.pole(as_reference(structure, bias), guess)
            assert level.energy_eV == pytest.approx(float(mp.re(exact)), abs=2e-15)
            assert level.width_eV == pytest.approx(float(-2 * mp.im(exact)), rel=1e-10)
            assert level.log10_width_eV == pytest.approx(float(mp.log10(-2 * mp.im(exact))))
            assert level.lifetime_s == pytest.approx(HBAR_EV_S / level.width_eV)


@pytest.mark.parametrize("name", ["two barriers", "biased", "graded well", "three barriers"])
def test_none_missed_and_none_invented(name: str) -> None:
    """The argument principle on an outgoing-wave condition integrated by scipy."""
    structure, bias = TRIED[name]
    window = (0.004, 0.297)
    found = find_levels(uniform_field(structure, bias), *window, 0.06)
    counted = integrated.count_poles(as_reference(structure, bias), *window, 0.06)
    assert found.complete
    assert found.counted == len(found.levels) == counted


def test_width_far_below_rounding() -> None:
    """A width near 1e-40 eV, held to 1e-10 of itself against 120 digits."""
    structure = two_barriers(43.0, 4.0, 45.0, 0.6)
    found = find_levels(uniform_field(structure), 0.0, 0.2)
    assert [level.kind for level in found.levels] == ["quasi-bound"]
    level = found.levels[0]
    assert 1e-45 < level.width_eV < 1e-35
    with mp.workdps(200):
        # The pole is nearer to the real axis than a double can say: start from the real energy.
        exact = many_digits.pole(as_reference(structure), complex(level.energy_eV, 0.0))
        assert level.width_eV == pytest.approx(float(-2 * mp.im(exact)), rel=1e-10)


def test_width_below_the_smallest_double() -> None:
    """Doubling the barriers squares the tunnelling factor (semi-classical exponent)."""
    thick, thicker = (
        find_levels(uniform_field(two_barriers(d, 4.0, d, 0.6)), 0.0, 0.2).levels[0]
        for d in (300.0, 600.0)
    )
    q = math.sqrt(0.092 * (0.6 - thick.energy_eV) / C)
    assert thicker.width_eV == 0.0
    assert thicker.kind == "quasi-bound"
    assert thicker.lifetime_s == math.inf
    drop = 2.0 * q * 300.0 / math.log(10.0)
    assert thick.log10_width_eV - thicker.log10_width_eV == pytest.approx(drop, rel=1e-9)
    assert thicker.peak_transmission == pytest.approx(1.0)


def test_peak_transmission_is_met_by_the_spectrum() -> None:
    """Breit-Wigner: T = 4 GL GR / G^2 at the level, half of it at half a width away."""
    profile = uniform_field(two_barriers(5.0, 5.0, 6.0), 0.04)
    level = find_levels(profile, 0.0, 0.2).levels[0]
    assert level.width_eV < 1e-4
    at = level.energy_eV + 0.5 * level.width_eV * np.array([-1.0, 0.0, 1.0])
    expected = level.peak_transmission * np.array([0.5, 1.0, 0.5])
    assert scatter(profile, at).transmission == pytest.approx(expected, rel=5e-3)
    assert level.left_width_eV + level.right_width_eV == pytest.approx(level.width_eV, rel=1e-14)


def test_partial_widths_by_fermis_golden_rule() -> None:
    """A thicker right barrier leaks less by exp(-2 q d); the left width stays (deep limit)."""
    thin, thick = (
        find_levels(uniform_field(two_barriers(12.0, 5.0, d)), 0.0, 0.2).levels[0]
        for d in (12.0, 13.0)
    )
    q = math.sqrt(0.092 * (0.3 - thin.energy_eV) / C)
    assert thick.left_width_eV == pytest.approx(thin.left_width_eV, rel=1e-6)
    ratio = thick.right_width_eV / thin.right_width_eV
    assert ratio == pytest.approx(math.exp(-2.0 * q), rel=1e-6)


def test_nodes_and_place() -> None:
    profile = uniform_field(two_barriers(4.0, 12.0, 4.0))
    found = find_levels(profile, 0.0, 0.29)
    assert [level.nodes for level in found.levels] == [0, 1, 2]
    assert all(level.share_by_layer[1] > 0.6 for level in found.levels)


def test_weak_wave_in_a_spacer_brings_no_nodes() -> None:
    spacer = (25.0, 0.0, 0.067)
    layers = [spacer, (4.0, 0.3, 0.092), (5.0, 0.0, 0.067), (4.0, 0.3, 0.092), spacer]
    found = find_levels(uniform_field(stack(layers)), 0.05, 0.12, 0.01)
    assert [level.nodes for level in found.levels] == [0]


def test_spacers_like_the_contacts_change_no_level() -> None:
    """However long: where the contact begins is then a matter of words."""
    plain = find_levels(uniform_field(two_barriers()), 0.0, 0.3, 0.1)
    spacer = (400.0, 0.0, 0.067)
    barriers = [(2.0, 0.3, 0.092), (5.0, 0.0, 0.067), (2.0, 0.3, 0.092)]
    spaced = find_levels(uniform_field(stack([spacer, *barriers, spacer])), 0.0, 0.3, 0.1)
    assert spaced.complete
    for one, other in zip(plain.levels, spaced.levels, strict=True):
        assert other.energy_eV == pytest.approx(one.energy_eV, abs=1e-15)
        assert other.width_eV == pytest.approx(one.width_eV, rel=1e-9)


def test_pair_split_by_tunnelling() -> None:
    """Two like wells: the symmetric state below the antisymmetric one (textbook)."""
    layers = [(4.0, 0.3, 0.092), (6.0, 0.0, 0.067)] * 2 + [(4.0, 0.3, 0.092)]
    lower, upper = find_levels(uniform_field(stack(layers)), 0.0, 0.1).levels
    assert (lower.nodes, upper.nodes) == (0, 1)
    assert upper.energy_eV - lower.energy_eV < 5e-3
    for level in (lower, upper):
        assert level.share_by_layer[1] == pytest.approx(level.share_by_layer[3], rel=1e-6)


@pytest.mark.parametrize(("middle", "accurate"), [(12.0, True), (40.0, False)])
def test_levels_that_all_but_coincide_say_so(middle: float, accurate: bool) -> None:
    layers = [(5.0, 0.3, 0.092), (6.0, 0.0, 0.067), (middle, 0.3, 0.092), (6.0, 0.0, 0.067)]
    found = find_levels(uniform_field(stack([*layers, (5.0, 0.3, 0.092)])), 0.0, 0.1)
    assert len(found.levels) == found.counted == 2
    assert found.accurate is accurate
    for level in found.levels:
        assert (level.width_error < 1e-6) is accurate
        # Both wells leak alike, so the widths are right whatever the mixture.
        assert level.width_eV == pytest.approx(3.54e-5, rel=0.02)


def test_bound_and_quasi_bound_in_one_window() -> None:
    """Below both contacts bound, between them open to one side, above open to both."""
    layers = [(3.0, 0.5, 0.09), (9.0, 0.0, 0.067), (3.0, 0.5, 0.09)]
    profile = uniform_field(stack(layers, (0.1, 0.067), (0.25, 0.067)))
    found = find_levels(profile, 0.0, 0.45)
    kinds = [level.kind for level in found.levels]
    assert kinds == ["bound", "quasi-bound", "quasi-bound"]
    assert found.levels[0].width_eV == 0.0
    assert found.levels[0].lifetime_s == math.inf
    assert found.levels[1].right_width_eV == 0.0
    assert found.levels[1].peak_transmission == 0.0
    assert found.levels[2].right_width_eV > 0.0
    assert found.complete


def test_count_of_a_superlattice_band() -> None:
    """N wells coupled make N levels a band (Kronig-Penney; textbook)."""
    layers = [(2.0, 0.3, 0.092), (5.0, 0.0, 0.067)] * 30 + [(2.0, 0.3, 0.092)]
    found = find_levels(uniform_field(stack(layers)), 0.05, 0.12, 0.05)
    assert found.complete
    assert found.counted == len(found.levels) == 30
    assert [level.nodes for level in found.levels] == list(range(30))


def test_the_thinnest_layer_that_is_taken() -> None:
    """A well far thinner than its wave binds at (V d)^2 m / 4c, as a delta function does."""
    thickness_nm, edge_eV, mass = THICKNESS_NM.low, -0.3, 0.067
    profile = uniform_field(stack([(thickness_nm, edge_eV, mass)]))
    (level,) = find_levels(profile, -0.3, 0.3).levels
    binding_eV = (edge_eV * thickness_nm) ** 2 * mass / (4.0 * C)
    assert level.energy_eV == pytest.approx(-binding_eV, rel=1e-3)
    with pytest.raises(StructureError, match="1e-6"):
        stack([(0.5 * thickness_nm, edge_eV, mass)])


def test_no_barrier_no_level() -> None:
    profile = uniform_field(stack([(5.0, 0.0, 0.067)]))
    found = find_levels(profile, 0.0, 0.5, 0.05)
    assert found.levels == ()
    assert found.complete


def test_max_width_and_window_are_kept() -> None:
    profile = uniform_field(two_barriers())
    assert len(find_levels(profile, 0.0, 0.3, 0.02).levels) == 1
    assert find_levels(profile, 0.0, 0.3, 0.005).levels == ()
    assert find_levels(profile, 0.0, 0.07).levels == ()


@pytest.mark.parametrize(
    ("low", "high", "width"),
    [(0.2, 0.2, 0.1), (0.3, 0.1, 0.1), (math.nan, 0.1, 0.1), (0.0, 0.1, 0.0), (0.0, 1e4, 0.1)],
)
def test_bad_windows(low: float, high: float, width: float) -> None:
    with pytest.raises(EnergyError):
        find_levels(uniform_field(two_barriers()), low, high, width)


def test_a_window_around_one_level() -> None:
    """However narrow, and with its end on the level itself."""
    profile = uniform_field(two_barriers(5.0, 5.0, 5.0))
    energy = find_levels(profile, 0.0, 0.2).levels[0].energy_eV
    for low, high in [(energy, 0.2), (0.0, energy), (energy - 1e-12, energy + 1e-12)]:
        found = find_levels(profile, low, high)
        assert found.complete
        assert [level.energy_eV for level in found.levels] == pytest.approx([energy], abs=1e-15)
    assert find_levels(profile, energy + 1e-12, 0.2).levels == ()


def test_contact_edges_that_only_rounding_sets_apart() -> None:
    layers = [(3.0, 0.4, 0.09), (6.0, 0.1, 0.067), (3.0, 0.4, 0.09)]
    structure = stack(layers, (0.1, 0.067), (0.1 + 2e-17, 0.067))
    apart = stack(layers, (0.1, 0.067), (0.1 + 3e-16, 0.067))
    for tried in (structure, apart):
        found = find_levels(uniform_field(tried), 0.05, 0.35)
        assert found.complete
        assert len(found.levels) == 1


thickness = st.floats(1.0, 9.0)
heights = st.floats(0.15, 0.8)


@settings(max_examples=25, deadline=None)
@given(st.lists(st.tuples(thickness, thickness, heights), min_size=1, max_size=4), thickness)
def test_every_narrow_line_of_the_spectrum_is_a_level(
    periods: list[tuple[float, float, float]], last: float
) -> None:
    """No peak of T between levels, and the widths' sum is the poles' imaginary part."""
    layers: list[tuple[float, ...]] = []
    for barrier, well, height in periods:
        layers += [(barrier, height, 0.09), (well, 0.0, 0.067)]
    profile = uniform_field(stack([*layers, (last, 0.5, 0.09)]))
    found = find_levels(profile, 0.005, 0.14, 0.2)
    assert found.complete
    energies = np.linspace(0.005, 0.14, 4001)
    log_t = scatter(profile, energies).log10_transmission
    peaks = energies[1:-1][(log_t[1:-1] > log_t[:-2]) & (log_t[1:-1] > log_t[2:])]
    places = np.array([level.energy_eV for level in found.levels])
    reach = np.array([max(level.width_eV, 1e-4) for level in found.levels])
    for peak in peaks:
        assert places.size
        assert np.any(np.abs(places - peak) < 2.0 * reach)


def test_levels_are_followed_through_a_small_change() -> None:
    """As `find_levels` finds them, bound, narrow and broad; one that crosses an edge too."""
    layers = [(3.0, 0.3, 0.09), (9.0, -0.15, 0.067), (2.5, 0.3, 0.09)]
    structure = stack(layers)
    for bias, change in ((0.1, 1e-4), (0.1, 3e-3), (0.004, -0.008)):
        before = find_levels(uniform_field(structure, bias), -0.3, 0.3)
        profile = uniform_field(structure, bias + change)
        expected = find_levels(profile, -0.3, 0.3)
        found = follow_levels(profile, before)
        assert len(found.levels) == len(expected.levels) > 2
        for one, other in zip(found.levels, expected.levels, strict=True):
            assert one.energy_eV == pytest.approx(other.energy_eV, abs=1e-12)
            assert one.width_eV == pytest.approx(other.width_eV, rel=1e-8)
