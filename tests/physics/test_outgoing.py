"""The closed stack's eigenvalues, and how many of them are taken on."""

from __future__ import annotations

import numpy as np
import pytest

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C
from physics.errors import EnergyError
from physics.field import uniform_field
from physics.levels import find_levels
from physics.outgoing import Sheet, closed_stack_energies
from physics.sectors import cut
from reference.stacks import stack


def test_many_eigenvalues_at_once() -> None:
    """Between two walls where the slope is zero: (n pi / d)^2 c / m, whatever the number."""
    thickness_nm, mass, window = 300.0, 1.0, (1e-5, 2.0)
    profile = uniform_field(stack([(thickness_nm, 0.0, mass)]))
    sectors = cut(profile, *window)
    found = closed_stack_energies(profile, sectors, Sheet(True, True), window, 1e-9)
    number = 2 + np.arange(found.size)  # 0 and 1 lie below the window
    exact = (number * np.pi / thickness_nm) ** 2 * C / mass
    assert found.size > 600
    assert found == pytest.approx(exact, abs=1e-9)


@pytest.mark.parametrize(("mass", "to_eV"), [(2.0, 2.0), (5.0, 5.0), (10.0, 3.0)])
def test_levels_that_take_too_long_are_refused(mass: float, to_eV: float) -> None:
    """Under a bias no sector is like another, which is what takes longest."""
    profile = uniform_field(stack([(300.0, 0.3, mass)]), 0.2)
    with pytest.raises(EnergyError, match="narrow the window to some") as caught:
        find_levels(profile, 0.0, to_eV)
    assert "take too long" in str(caught.value)


def test_a_stack_that_takes_too_long_for_any_level_is_refused() -> None:
    layers = [(1.0 + 1e-4 * n, 0.3 * (n % 2), 0.09) for n in range(16_000)]
    with pytest.raises(EnergyError, match="describe fewer layers, or thinner ones"):
        find_levels(uniform_field(stack(layers)), 0.0, 0.001)
