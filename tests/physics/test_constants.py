"""Constants against scipy.constants (CODATA)."""

import pytest
import scipy.constants as sc

from physics import constants


def test_exact_by_definition() -> None:
    assert constants.ELEMENTARY_CHARGE_C == sc.e
    assert constants.PLANCK_J_S == sc.h
    assert constants.BOLTZMANN_J_PER_K == sc.k


def test_adjusted() -> None:
    # Two editions of CODATA differ by less than the adjustment's own uncertainty of a few 1e-10.
    assert pytest.approx(sc.m_e, rel=2e-9) == constants.ELECTRON_MASS_KG
    assert pytest.approx(sc.epsilon_0, rel=2e-9) == constants.ELECTRIC_CONSTANT_F_PER_M


def test_derived() -> None:
    assert pytest.approx(sc.hbar / sc.e, rel=1e-15) == constants.HBAR_EV_S
    assert pytest.approx(sc.k / sc.e, rel=1e-15) == constants.BOLTZMANN_EV_PER_K
    derived = sc.hbar**2 / (2.0 * constants.ELECTRON_MASS_KG) / sc.e * 1e18
    assert pytest.approx(derived, rel=1e-14) == constants.HBAR2_OVER_2M0_EV_NM2
