"""T with a voltage probe in every well: a lattice of dense matrices; one well to many digits.

Nothing is shared with `physics`: Green's function of the whole stack by inversion, the lattice's
own self-energies for the contacts, all pairs' T_ij = Tr(Gamma_i G Gamma_j G+), and the probes'
filling from a linear system (M. Buttiker, IBM J. Res. Dev. 32, 63 (1988), and S. Datta, Electronic
Transport in Mesoscopic Systems, ch. 3; both from memory). The lattice errs by its spacing squared.
"""

from __future__ import annotations

import mpmath as mp
import numpy as np
from numpy.typing import NDArray

from reference import many_digits

HBAR2_OVER_2M0 = 0.0380998212
"""eV nm^2, from hbar = 1.054571817e-34 J s and m0 = 9.1093837e-31 kg."""

Layer = tuple[float, float, float, float, int]
"""Thickness in nm, edge at either face in eV, mass, number of the well or -1."""


def transmission(
    layers: list[Layer],
    contacts: tuple[tuple[float, float], tuple[float, float]],
    energy: float,
    gamma_phi: float,
    spacing: float,
) -> float:
    """T by all ways; every thickness is a whole number of spacings."""
    (left_edge, left_mass), (right_edge, right_mass) = contacts
    first = (spacing, left_edge, left_edge, left_mass, -1)  # a cell of each contact: beyond, all
    last = (spacing, right_edge, right_edge, right_mass, -1)  # is alike
    edge, mass, well = _cells([first, *layers, last], spacing)
    c = HBAR2_OVER_2M0 / spacing**2
    across = np.concatenate(([left_mass], mass, [right_mass]))
    hop = 2.0 * c / (across[1:] + across[:-1])
    hamiltonian = np.diag(edge + hop[1:] + hop[:-1]).astype(complex)
    hamiltonian -= np.diag(hop[1:-1], 1) + np.diag(hop[1:-1], -1)
    loss = np.where(well >= 0, gamma_phi, 0.0)
    hamiltonian -= np.diag(0.5j * loss)
    ends = [
        _self_energy(energy - left_edge, c / left_mass),
        _self_energy(energy - right_edge, c / right_mass),
    ]
    hamiltonian[0, 0] += ends[0]
    hamiltonian[-1, -1] += ends[1]
    green = np.linalg.inv(energy * np.eye(edge.size) - hamiltonian)
    gammas = [np.where(well == n, gamma_phi, 0.0) for n in range(well.max() + 1)]
    for place, end in ((0, ends[0]), (-1, ends[1])):
        gamma = np.zeros(edge.size)
        gamma[place] = -2.0 * end.imag
        gammas.append(gamma)
    pairs = np.array([[one @ np.abs(green) ** 2 @ two for two in gammas] for one in gammas])
    return _through(pairs)


def _through(pairs: NDArray[np.float64]) -> float:
    """T from the second last terminal to the last, where all others draw no current."""
    between = pairs - np.diag(np.diag(pairs))
    network = np.diag(between.sum(axis=1)) - between
    filling = np.linalg.solve(network[:-2, :-2], between[:-2, -2])
    return float(between[-1, -2] + between[-1, :-2] @ filling)


def _cells(
    layers: list[Layer], spacing: float
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.int64]]:
    edges, masses, wells = [], [], []
    for thickness, left, right, mass, well in layers:
        number = round(thickness / spacing)
        share = (np.arange(number) + 0.5) / number
        edges.append(left + (right - left) * share)
        masses.append(np.full(number, mass))
        wells.append(np.full(number, well))
    return np.concatenate(edges), np.concatenate(masses), np.concatenate(wells)


def _self_energy(above: float, hop: float) -> complex:
    """Of a half-infinite chain with on-site 2 hop: hop^2 times its surface Green's function."""
    return complex(-hop * np.exp(1j * np.arccos(1.0 - above / (2.0 * hop))))


def one_well(stack: many_digits.Stack, well: int, energy: float, gamma_phi: float) -> mp.mpf:
    """T by all ways of a stack whose slab number ``well`` has a probe, both contacts open.

    What the probe takes is what is neither reflected nor transmitted: with many digits the
    difference does no harm.
    """
    e = mp.mpf(energy)
    total = mp.eye(2)
    for n, slab in enumerate(stack.slabs):
        raised = mp.mpc(e, mp.mpf(gamma_phi) / 2) if n == well else e
        total = many_digits.slab_matrix(slab, raised) * total
    c = many_digits.constant()
    q, p = (mp.sqrt(c * (e - edge) / mass) for edge, mass in (stack.left, stack.right))
    (a, b), (c, d) = total.tolist()
    # 1 + r and iq (1 - r) at the left face become t and ip t at the right one; det = 1.
    below = (1j * p * a - c) + 1j * q * (d - 1j * p * b)
    through = 4 * q * p / abs(below) ** 2
    left = 1 - abs((1j * q * (d - 1j * p * b) - (1j * p * a - c)) / below) ** 2 - through
    right = 1 - abs((1j * p * (a - 1j * q * b) - (1j * q * d - c)) / below) ** 2 - through
    return through + left * right / (left + right)
