"""R. Tsu and L. Esaki, Appl. Phys. Lett. 22, 562 (1973), from memory.

In two equal barriers the level lies half-way down the drop, so that the current peaks where it
passes the emitter's band edge: at twice the level's energy. The paper reads this off to within its
line's width and the shift by the field; an eighth is allowed for both.
"""

import numpy as np
import pytest

from physics.curve import Drive, own_curve
from physics.extremes import regions
from physics.field import uniform_field
from physics.levels import find_levels
from physics.structure import Contact, Structure
from reference.stacks import two_barriers


@pytest.mark.parametrize(("barrier_nm", "well_nm"), [(2.0, 5.0), (3.0, 6.0), (2.5, 7.0)])
def test_peaks_at_twice_the_levels(barrier_nm: float, well_nm: float) -> None:
    contact = Contact(0.0, 0.067, 0.005)
    bare = two_barriers(barrier_nm, well_nm, barrier_nm, 0.5)
    structure = Structure(contact, bare.layers, contact)
    levels = find_levels(uniform_field(structure), 1e-6, 0.5).levels
    drive = Drive(
        structure,
        77.0,
        lambda biases: [uniform_field(structure, bias) for bias in biases.tolist()],
    )
    first = regions(drive, own_curve(drive, 0.0, 3.0 * levels[0].energy_eV))[0]
    assert first.peak.bias_V == pytest.approx(2.0 * levels[0].energy_eV, rel=0.125)
    assert np.sign(first.peak.current_density_A_per_cm2) == 1.0
