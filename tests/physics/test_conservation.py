"""The current is the same at every x, and from either side."""

import numpy as np
import pytest

from physics.field import Profile, uniform_field
from physics.leaving import carry_from
from physics.poisson import screened_field
from physics.scattering import contact_flux_eV_nm, scatter
from physics.sectors import cut
from physics.structure import Contact, Layer, Structure
from reference.stacks import stack

STRUCTURE = stack(
    [
        (4.0, 0.0, 0.067),
        (2.0, 0.3, 0.092),
        (5.0, 0.02, 0.067),
        (3.0, 0.25, 0.09, 0.3),
        (4.0, 0.0, 0.067),
    ]
)


def profiles() -> list[Profile]:
    filled = Structure(Contact(0.0, 0.067, 0.05), STRUCTURE.layers, Contact(0.0, 0.067, 0.05))
    two_band = Structure(
        Contact(0.0, 0.067, gap_eV=1.4),
        tuple(
            Layer(x.thickness_nm, x.edge_eV, x.mass, x.to_edge_eV, gap_eV=1.4)
            for x in STRUCTURE.layers
        ),
        Contact(0.0, 0.067, gap_eV=1.4),
    )
    return [
        uniform_field(STRUCTURE, 0.15),
        uniform_field(STRUCTURE, -0.15),
        uniform_field(two_band, 0.15, band="kane"),
        screened_field(filled, 0.15, 300.0).profile,
    ]


@pytest.mark.parametrize("case", range(4))
def test_flux_at_every_face(case: int) -> None:
    """Im(psi* f) of each wave at all faces of all sectors, against what T says."""
    profile = profiles()[case]
    low = max(profile.contact_edge_eV)
    energy = low + np.array([1e-3, 0.03, 0.08, 0.15, 0.3, 0.6])
    sectors = cut(profile, float(energy[0]), float(energy[-1]))
    q = [contact_flux_eV_nm(profile, side, energy) for side in (0, 1)]
    through = scatter(profile, energy).transmission
    for from_right in (True, False):  # the wave that leaves to the right came from the left
        out = q[1] if from_right else -q[0]
        psi, flux, log_scale = carry_from(sectors, energy + 0j, 1j * out, from_right=from_right)
        current = (psi.conj() * flux).imag * np.exp(2.0 * log_scale)
        assert current == pytest.approx(np.broadcast_to(out, current.shape), rel=1e-9)
        face = 0 if from_right else -1
        q_in = q[0] if from_right else q[1]
        inward = 1.0 if from_right else -1.0
        incident = 0.25 * np.abs(psi[face] + inward * flux[face] / (1j * q_in)) ** 2
        incident *= np.exp(2.0 * log_scale[face])
        assert np.abs(out) / (q_in * incident) == pytest.approx(through, rel=1e-9)
