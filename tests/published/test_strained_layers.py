"""Strained layers as published: critical thickness and gap.

All from memory; a tolerance is how far the source as remembered, and the conventions in use, reach.
"""

from __future__ import annotations

import pytest

from physics.materials import material
from physics.strain import critical_thickness_nm, poisson_ratio, strain_on


def limits(formula: str) -> tuple[float, float]:
    """Critical thickness on GaAs with a free surface, and buried."""
    layer = material(formula)
    in_plane, nu = strain_on(layer, material("GaAs")).in_plane, poisson_ratio(layer.elastic)
    free = critical_thickness_nm(in_plane, layer.lattice_nm, nu, 1)
    buried = critical_thickness_nm(in_plane, layer.lattice_nm, nu, 2)
    assert free is not None
    assert buried is not None
    return free, buried


def test_a_well_of_in02_ga08_as_on_gaas() -> None:
    """10 to 20 nm buried; about half of it with a free surface (common practice)."""
    free, buried = limits("In0.2Ga0.8As")
    assert 10.0 < buried < 20.0
    assert 5.0 < free < 8.0


def test_si08_ge02_on_silicon() -> None:
    """About 12 nm with a free surface: the curve after Matthews and Blakeslee in R. People and
    J. C. Bean, Appl. Phys. Lett. 47, 322 (1985); within 20 %.

    No material of the catalogue, so the numbers are put in: a mismatch of 4.17 % times 0.2,
    nu = 0.28, silicon's lattice.
    """
    found = critical_thickness_nm(-0.2 * 0.0417, 0.5431, 0.28, 1)
    assert found == pytest.approx(12.0, rel=0.2)


@pytest.mark.parametrize("x", [0.1, 0.15, 0.2, 0.25])
def test_the_gap_of_ingaas_strained_to_gaas(x: float) -> None:
    """1.424 - 1.06 x + 0.08 x^2 eV at 300 K, compressed (common practice); 1.20 to 1.22 at 0.2."""
    layer = material(f"In{x}Ga{1 - x:.2f}As")
    strain = strain_on(layer, material("GaAs"))
    assert strain.gap_eV == pytest.approx(1.424 - 1.06 * x + 0.08 * x * x, abs=0.025)
    assert strain.gap_eV > layer.gap_eV
    assert strain.heavy_hole_shift_eV > strain.light_hole_shift_eV
