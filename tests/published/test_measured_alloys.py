"""Gaps, offsets and masses as measured, by other authors than the catalogue's.

All from memory. A tolerance is how far measurement and catalogue are known to lie apart.
"""

from __future__ import annotations

import pytest
from scipy.optimize import brentq

from physics.materials import material


@pytest.mark.parametrize(
    ("formula", "gap", "tolerance"),
    [
        ("GaAs", 1.424, 0.003),  # J. S. Blakemore, J. Appl. Phys. 53, R123 (1982)
        ("InP", 1.344, 0.010),  # L. Pavesi et al., Phys. Rev. B 44, 9052 (1991)
        ("InAs", 0.354, 0.002),  # O. Madelung, Semiconductors: Data Handbook (2004)
        ("GaSb", 0.726, 0.002),  # common practice
        ("InSb", 0.17, 0.005),  # common practice
        ("GaP", 2.78, 0.01),  # common practice, the direct gap
        ("In0.53Ga0.47As", 0.75, 0.015),  # common practice; 0.737 to 0.75 are found
        ("In0.52Al0.48As", 1.45, 0.015),  # common practice
        ("Ga0.51In0.49P", 1.90, 0.02),  # disordered, matched to GaAs; common practice
        ("GaAs0.51Sb0.49", 0.765, 0.045),  # 0.72 to 0.81 are found; common practice
    ],
)
def test_direct_gaps_at_room_temperature(formula: str, gap: float, tolerance: float) -> None:
    assert abs(material(formula, 300.0).gap_eV - gap) <= tolerance


@pytest.mark.parametrize(
    ("formula", "gap", "tolerance"),
    [
        ("AlAs", 2.168, 0.01),  # J. S. Blakemore and S. Adachi; common practice
        ("GaP", 2.27, 0.015),  # common practice
        # Decides which of the review's two slopes for AlSb, 0.39 and 0.58 meV/K, is that of X.
        ("AlSb", 1.615, 0.01),  # common practice, 1.61 to 1.62
        # Decides the sign of AlInP's bowing at X; 2.29 to 2.35 are found.
        ("Al0.52In0.48P", 2.32, 0.04),  # common practice
    ],
)
def test_gaps_at_x_at_room_temperature(formula: str, gap: float, tolerance: float) -> None:
    found = material(formula, 300.0)
    valence = found.edge_eV - found.gap_eV
    assert abs(found.x_edge_eV - valence - gap) <= tolerance


@pytest.mark.parametrize("x", [0.1, 0.2, 0.3, 0.4, 0.6, 0.8])
def test_algaas_after_aspnes(x: float) -> None:
    """D. E. Aspnes et al., J. Appl. Phys. 60, 754 (1986): the source of the review's cubic bowing.

    Older work, as 1.424 + 1.247 x (H. C. Casey and M. B. Panish), lies 0.04 eV lower at x = 0.3.
    """
    expected = 1.424 + 1.594 * x + x * (1.0 - x) * (0.127 - 1.310 * x)
    assert abs(material(f"Al{x}Ga{1 - x:.1f}As", 300.0).gap_eV - expected) < 0.016


@pytest.mark.parametrize("x", [0.1, 0.2, 0.3, 0.4])
def test_algaas_conduction_share(x: float) -> None:
    """60 to 67 % of the Gamma gap's step is in the conduction band (common practice)."""
    low, high = material("GaAs"), material(f"Al{x}Ga{1 - x:.1f}As")
    assert 0.60 <= (high.edge_eV - low.edge_eV) / (high.gap_eV - low.gap_eV) <= 0.67


def test_algaas_turns_indirect() -> None:
    """Gamma and X cross between x = 0.37 and 0.46 (common practice)."""

    def gamma_above_x(x: float) -> float:
        found = material(f"Al{x:.9f}Ga{1 - x:.9f}As")
        return found.edge_eV - found.x_edge_eV

    assert 0.37 < brentq(gamma_above_x, 0.1, 0.9) < 0.46


def test_offset_of_the_alloys_matched_to_inp() -> None:
    """0.50 to 0.53 eV between In0.53Ga0.47As and In0.52Al0.48As (common practice)."""
    well, barrier = material("In0.53Ga0.47As"), material("In0.52Al0.48As")
    assert 0.50 <= barrier.edge_eV - well.edge_eV <= 0.53
    assert abs(well.mass - 0.043) < 0.003
    assert abs(barrier.mass - 0.075) < 0.003


@pytest.mark.parametrize("formula", ["In0.53Ga0.47As", "In0.52Al0.48As", "GaAs0.51Sb0.49"])
def test_alloys_matched_to_inp(formula: str) -> None:
    assert abs(material(formula).lattice_nm / material("InP").lattice_nm - 1.0) < 5e-4


@pytest.mark.parametrize("y", [0.1, 0.3, 0.5, 0.7, 0.9])
def test_ingaasp_after_nahory(y: float) -> None:
    """R. E. Nahory et al., Appl. Phys. Lett. 33, 659 (1978): 1.35 - 0.72 y + 0.12 y^2 eV, 298 K."""

    def formula(x: float) -> str:
        return f"Ga{x:.9f}In{1 - x:.9f}As{y:.9f}P{1 - y:.9f}"

    def mismatch(x: float) -> float:
        return material(formula(x)).lattice_nm - material("InP").lattice_nm

    matched = material(formula(brentq(mismatch, 0.0, 0.5)), 298.0)
    assert abs(matched.gap_eV - (1.35 - 0.72 * y + 0.12 * y * y)) < 0.018


@pytest.mark.parametrize("z", [0.2, 0.4, 0.6, 0.8])
def test_algainas_after_olego(z: float) -> None:
    """D. Olego et al., Appl. Phys. Lett. 41, 476 (1982): 0.76 + 0.49 z + 0.20 z^2 eV, on InP."""
    aluminium, gallium = 0.48 * z, 0.47 * (1.0 - z)
    indium = 1.0 - aluminium - gallium
    found = material(f"In{indium:.9f}Al{aluminium:.9f}Ga{gallium:.9f}As", 300.0)
    assert abs(found.gap_eV - (0.76 + 0.49 * z + 0.20 * z * z)) < 0.012
