"""Printed values of I. Vurgaftman, J. R. Meyer, L. R. Ram-Mohan, J. Appl. Phys. 89, 5815 (2001).

From memory; `tests/physics/test_material_library.py` holds the same table against a data library.
"""

from __future__ import annotations

import math

import pytest

from physics.materials import material

# Compound: gaps at Gamma, X, L at 0 K (eV), valence offset (eV), mass (m0), lattice constant (nm).
COMPOUNDS = {
    "GaAs": (1.519, 1.981, 1.815, -0.80, 0.067, 0.565325),
    "AlAs": (3.099, 2.24, 2.46, -1.33, 0.15, 0.56611),
    "InAs": (0.417, 1.433, 1.133, -0.59, 0.026, 0.60583),
    "GaP": (2.886, 2.35, 2.72, -1.27, 0.13, 0.54505),
    "AlP": (3.63, 2.52, 3.57, -1.74, 0.22, 0.54672),
    "InP": (1.4236, 2.384, 2.014, -0.94, 0.0795, 0.58697),
    "GaSb": (0.812, 1.141, 0.875, -0.03, 0.039, 0.60959),
    "AlSb": (2.386, 1.696, 2.329, -0.41, 0.14, 0.61355),
    "InSb": (0.235, 0.63, 0.93, 0.0, 0.0135, 0.64794),
}


@pytest.mark.parametrize("name", COMPOUNDS)
def test_compounds(name: str) -> None:
    gamma, x, low, offset, mass, lattice = COMPOUNDS[name]
    cold = material(name, 0.0)
    assert cold.gap_eV == gamma
    assert cold.edge_eV == pytest.approx(offset + gamma, abs=1e-12)
    assert cold.x_edge_eV == pytest.approx(offset + x, abs=1e-12)
    assert cold.l_edge_eV == pytest.approx(offset + low, abs=1e-12)
    assert cold.mass == mass
    assert material(name).lattice_nm == lattice


# The same laws written out at 300 K by hand (eV).
GAPS_AT_300_K = [
    ("GaAs", 1.519 - 0.5405e-3 * 300**2 / 504),
    ("AlAs", 3.099 - 0.885e-3 * 300**2 / 830),
    ("InP", 1.4236 - 0.363e-3 * 300**2 / 462),
    ("GaP", 2.886 - 2 * 0.1081 / (math.exp(328 / 300) - 1)),  # coth y - 1 = 2 / (exp(2 y) - 1)
    ("GaSb", 0.812 - 0.417e-3 * 300**2 / 440),
]


@pytest.mark.parametrize(("name", "gap"), GAPS_AT_300_K)
def test_gaps_at_room_temperature(name: str, gap: float) -> None:
    assert material(name, 300.0).gap_eV == pytest.approx(gap, abs=1e-12)


def test_x_of_inp_falls_linearly() -> None:
    cold, warm = material("InP", 0.0), material("InP", 200.0)
    assert cold.x_edge_eV - warm.x_edge_eV == pytest.approx(3.7e-4 * 200.0, abs=1e-12)


# Half-and-half alloys: mean of the compounds less a quarter of the printed bowing. Gamma gap, 0 K.
GAMMA_BOWING = [
    ("Al0.5Ga0.5As", "AlAs", "GaAs", -0.127 + 1.310 * 0.5),
    ("Ga0.5In0.5As", "GaAs", "InAs", 0.477),
    ("Al0.5In0.5As", "AlAs", "InAs", 0.70),
    ("Ga0.5In0.5P", "GaP", "InP", 0.65),
    ("Al0.5In0.5P", "AlP", "InP", -0.48),
    ("Al0.5Ga0.5P", "AlP", "GaP", 0.0),
    ("Ga0.5In0.5Sb", "GaSb", "InSb", 0.415),
    ("Al0.5In0.5Sb", "AlSb", "InSb", 0.43),
    ("Al0.5Ga0.5Sb", "AlSb", "GaSb", -0.044 + 1.22 * 0.5),
    ("GaAs0.5Sb0.5", "GaAs", "GaSb", 1.43),
    ("InAs0.5Sb0.5", "InAs", "InSb", 0.67),
    ("AlAs0.5Sb0.5", "AlAs", "AlSb", 0.8),
    ("GaAs0.5P0.5", "GaAs", "GaP", 0.19),
    ("InAs0.5P0.5", "InAs", "InP", 0.10),
    ("AlAs0.5P0.5", "AlAs", "AlP", 0.22),
    ("GaP0.5Sb0.5", "GaP", "GaSb", 2.7),
    ("InP0.5Sb0.5", "InP", "InSb", 1.9),
    ("AlP0.5Sb0.5", "AlP", "AlSb", 2.7),
]


@pytest.mark.parametrize(("alloy", "one", "other", "bowing"), GAMMA_BOWING)
def test_bowing_of_the_gamma_gap(alloy: str, one: str, other: str, bowing: float) -> None:
    mean = 0.5 * (COMPOUNDS[one][0] + COMPOUNDS[other][0])
    assert material(alloy, 0.0).gap_eV == pytest.approx(mean - 0.25 * bowing, abs=1e-12)


@pytest.mark.parametrize(
    ("alloy", "one", "other", "bowing"),
    [
        ("Al0.5Ga0.5As", "AlAs", "GaAs", 0.0),
        ("Ga0.5In0.5As", "GaAs", "InAs", 0.0091),
        ("Al0.5In0.5As", "AlAs", "InAs", 0.049),
        ("Ga0.5In0.5P", "GaP", "InP", 0.051),
        ("Al0.5In0.5P", "AlP", "InP", 0.22),
        ("Ga0.5In0.5Sb", "GaSb", "InSb", 0.0092),
        ("InAs0.5Sb0.5", "InAs", "InSb", 0.035),
    ],
)
def test_bowing_of_the_mass(alloy: str, one: str, other: str, bowing: float) -> None:
    mean = 0.5 * (COMPOUNDS[one][4] + COMPOUNDS[other][4])
    assert material(alloy).mass == pytest.approx(mean - 0.25 * bowing, abs=1e-12)


@pytest.mark.parametrize(
    ("alloy", "one", "other", "bowing"),
    [
        ("Al0.5Ga0.5As", "AlAs", "GaAs", 0.0),
        ("Ga0.5In0.5As", "GaAs", "InAs", -0.38),
        ("Al0.5In0.5As", "AlAs", "InAs", -0.64),
        ("GaAs0.5Sb0.5", "GaAs", "GaSb", -1.06),
        ("AlAs0.5Sb0.5", "AlAs", "AlSb", -1.71),
        ("InAs0.5Sb0.5", "InAs", "InSb", 0.0),
    ],
)
def test_bowing_of_the_valence_offset(alloy: str, one: str, other: str, bowing: float) -> None:
    mean = 0.5 * (COMPOUNDS[one][3] + COMPOUNDS[other][3])
    found = material(alloy)
    assert found.edge_eV - found.gap_eV == pytest.approx(mean - 0.25 * bowing, abs=1e-12)
