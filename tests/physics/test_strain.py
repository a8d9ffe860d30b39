"""Strain by closed forms, by signs, and against a general data library; the critical thickness."""

from __future__ import annotations

import math
from dataclasses import replace

import openbandparams
import pytest
from hypothesis import given
from hypothesis import strategies as st
from openbandparams.iii_v_zinc_blende_strained import IIIVZincBlendeStrained001
from scipy.optimize import brentq

from physics.errors import MaterialError
from physics.formula import GROUP_III, GROUP_V
from physics.materials import Elastic, Material, material
from physics.strain import critical_thickness_nm, poisson_ratio, strain_on, strained

COMPOUNDS = [a + b for a in GROUP_III for b in GROUP_V]
# Made up so that everything can be worked out by hand.
ROUND = Elastic(c11_GPa=100.0, c12_GPa=50.0, c44_GPa=50.0, a_c_eV=-7.0, a_v_eV=-1.0, b_eV=-2.0)
SOFT = Material("soft", 1.0, 0.07, None, 0.6, 0.3, 1.5, 2.0, 2.1, ROUND)
SMALL = replace(SOFT, name="small", lattice_nm=0.594, monolayer_nm=0.297)


def test_by_hand() -> None:
    """-1 % in the plane and +1 % along growth: trace -1 %, Q = -2 (0.02) = -0.04 eV."""
    found = strain_on(SOFT, SMALL)
    assert found.in_plane == pytest.approx(-0.01, rel=1e-12)
    assert found.perpendicular == pytest.approx(0.01, rel=1e-12)
    assert found.trace == pytest.approx(-0.01, rel=1e-12)
    assert found.edge_shift_eV == pytest.approx(0.07, rel=1e-12)
    assert found.heavy_hole_shift_eV == pytest.approx(-0.01 + 0.04, rel=1e-12)
    assert found.light_hole_shift_eV == pytest.approx(-0.01 - 0.04, rel=1e-12)
    assert found.gap_eV == pytest.approx(1.5 + 0.07 - 0.03, rel=1e-12)
    assert found.monolayer_nm == pytest.approx(0.303, rel=1e-12)


def test_a_strained_material() -> None:
    found, moved = strain_on(SOFT, SMALL), strained(SOFT, strain_on(SOFT, SMALL))
    assert moved.edge_eV == 1.0 + found.edge_shift_eV
    assert (moved.gap_eV, moved.monolayer_nm) == (found.gap_eV, found.monolayer_nm)
    assert replace(moved, edge_eV=1.0, gap_eV=1.5, monolayer_nm=0.3) == SOFT


@pytest.mark.parametrize("name", COMPOUNDS)
@pytest.mark.parametrize("kelvin", [4.0, 300.0])
def test_nothing_happens_on_ones_own_lattice(name: str, kelvin: float) -> None:
    known = material(name, kelvin)
    found = strain_on(known, known)
    assert (found.in_plane, found.edge_shift_eV, found.gap_eV) == (0.0, 0.0, known.gap_eV)
    assert strained(known, found) == known


@pytest.mark.parametrize("name", COMPOUNDS)
@pytest.mark.parametrize("percent", [-1.5, -0.3, 0.2, 1.0])
def test_signs(name: str, percent: float) -> None:
    """Compression raises the conduction edge and the heavy hole over the light one."""
    known = material(name)
    lattice = known.lattice_nm * (1.0 + percent / 100.0)
    found = strain_on(known, replace(known, lattice_nm=lattice))
    sign = math.copysign(1.0, -percent)
    assert found.edge_shift_eV * sign > 0.0
    assert (found.heavy_hole_shift_eV - found.light_hole_shift_eV) * sign > 0.0
    assert (found.heavy_hole_shift_eV + found.light_hole_shift_eV) * sign < 0.0
    own = known.elastic
    without_split = (own.a_c_eV + own.a_v_eV) * found.trace
    mean = 0.5 * (found.heavy_hole_shift_eV + found.light_hole_shift_eV)
    assert found.edge_shift_eV - mean == pytest.approx(without_split, rel=1e-9)
    uppermost = max(found.heavy_hole_shift_eV, found.light_hole_shift_eV)
    assert found.gap_eV == pytest.approx(known.gap_eV + found.edge_shift_eV - uppermost, rel=1e-12)


def test_gaas_moves_as_the_review_says() -> None:
    """a_c + a_v = -8.33 eV: all-round pressure is left out of it, 1 % of volume is 83 meV."""
    own = material("GaAs").elastic
    assert own.a_c_eV + own.a_v_eV == pytest.approx(-8.33)


LAYERS = {
    "In0.2Ga0.8As": openbandparams.GaInAs(x=0.8),
    "In0.7Ga0.3As": openbandparams.GaInAs(x=0.3),
    "Al0.3In0.7As": openbandparams.AlInAs(x=0.3),
    "GaAs0.8P0.2": openbandparams.GaPAs(x=0.2),
    "GaAs0.7Sb0.3": openbandparams.GaAsSb(x=0.7),
    "GaSb": openbandparams.GaSb,
    "InAs": openbandparams.InAs,
}


@pytest.mark.parametrize("layer", LAYERS)
@pytest.mark.parametrize("substrate", ["GaAs", "InP", "InAs"])
def test_against_the_library(layer: str, substrate: str) -> None:
    """Given the same strain along growth: it takes the strain in the plane as 1 - a / a_s.

    The strain itself differs by the square of it, and is compared within that.
    """
    found = strain_on(material(layer), material(substrate))
    theirs = IIIVZincBlendeStrained001(LAYERS[layer], strain_out_of_plane=found.perpendicular)
    assert found.in_plane == pytest.approx(theirs.strain_in_plane(T=300.0), abs=1e-12)
    assert found.edge_shift_eV == pytest.approx(theirs.CBO_strain_shift(T=300.0), abs=1e-12)
    heavy, light = theirs.VBO_hh_strain_shift(T=300.0), theirs.VBO_lh_strain_shift(T=300.0)
    assert found.heavy_hole_shift_eV == pytest.approx(heavy, abs=1e-12)
    assert found.light_hole_shift_eV == pytest.approx(light, abs=1e-12)
    gap_shift = theirs.Eg_strain_shift(T=300.0)
    assert found.gap_eV - material(layer).gap_eV == pytest.approx(gap_shift, abs=1e-12)
    bare = LAYERS[layer].strained_001(getattr(openbandparams, substrate))
    difference = abs(found.in_plane - bare.strain_in_plane(T=300.0))
    assert difference <= 1.2 * found.in_plane**2


def test_strain_follows_the_temperature_and_monolayers_do_not() -> None:
    cold = strain_on(material("InAs", 4.0), material("GaAs", 4.0))
    warm = strain_on(material("InAs", 300.0), material("GaAs", 300.0))
    assert cold.in_plane != warm.in_plane
    assert cold.monolayer_nm == warm.monolayer_nm


def test_what_is_not_known_or_closes_is_refused() -> None:
    for missing in ({"elastic": None}, {"lattice_nm": None}, {"gap_eV": None}):
        with pytest.raises(MaterialError, match="its strain is not known"):
            strain_on(replace(SOFT, **missing), SMALL)
    with pytest.raises(MaterialError, match="'small': its strain is not known"):
        strain_on(SOFT, replace(SMALL, lattice_nm=None))
    with pytest.raises(MaterialError, match="'InAs': its gap, strained to InSb, is -0"):
        strain_on(material("InAs"), material("InSb"))


@given(
    st.floats(1e-6, 0.2),
    st.floats(0.5, 0.7),
    st.floats(0.1, 0.45),
    st.sampled_from([1, 2]),
    st.booleans(),
)
def test_critical_thickness_solves_its_equation(
    strain: float, lattice: float, poisson: float, kinks: int, is_stretched: bool
) -> None:
    """The equation written out again, and solved by bisection and the like between its bounds."""
    burgers = lattice / math.sqrt(2.0)
    factor = 8 // kinks
    scale = (1.0 - poisson / 4.0) / (factor * math.pi * strain * (1.0 + poisson) * 0.5)

    def excess(u: float) -> float:
        return u - scale * (math.log(u) + 1.0)

    found = critical_thickness_nm(strain if is_stretched else -strain, lattice, poisson, kinks)
    if scale < 1.0:
        assert found is None
        return
    assert found is not None
    assert found >= burgers * (1.0 - 1e-12)
    expected = brentq(excess, scale, 1e3 * scale, xtol=1e-14, rtol=1e-14)
    # Where both roots meet, at scale 1, rounding is magnified by 1 / (1 - scale / u).
    margin = max(1e-12, 1e-15 / (1.0 - scale / expected) if expected > scale else 1e-7)
    assert found == pytest.approx(burgers * expected, rel=max(margin, 1e-12), abs=0.0)


def test_critical_thickness_falls_with_the_strain_and_with_one_kink() -> None:
    strains = [1e-4, 1e-3, 0.01, 0.02]
    buried = [critical_thickness_nm(strain, 0.565, 0.31) for strain in strains]
    free = [critical_thickness_nm(strain, 0.565, 0.31, 1) for strain in strains]
    assert sorted(buried, reverse=True) == buried
    for two, one in zip(buried, free, strict=True):
        assert 2.0 < two / one < 3.0
    assert critical_thickness_nm(0.0, 0.565, 0.31) == math.inf


def test_no_solution() -> None:
    assert critical_thickness_nm(0.2, 0.6, 0.33) is None


def test_poissons_ratio_of_gaas() -> None:
    """0.31 to 0.32 (common practice)."""
    assert poisson_ratio(material("GaAs").elastic) == pytest.approx(0.316, abs=0.003)
