"""Voltage probes in wells: what passes between the contacts and all wells, and in the end.

In each well an imaginary potential ``-i Gamma_phi / 2`` takes electrons out of the coherent wave,
and a probe that draws no net current at any energy gives them back without their phase and without
their direction (M. Buttiker, IBM J. Res. Dev. 32, 63 (1988); for a level, A. D. Stone and P. A.
Lee, Phys. Rev. Lett. 54, 1196 (1985); both from memory). The sectors of a well thus see the energy
``E + i Gamma_phi / 2``; all else is as in `scattering`.

With psi_L and psi_R, the solutions that leave to the left and to the right, Green's function is
``psi_L(x<) psi_R(x>) / W``, ``W = psi_L f_R - psi_R f_L`` at every x. Between the contacts (flux
``q`` for |psi| = 1 at the face) and the wells (``n``: integral of |psi|^2 over one) pass::

    T_LR = 4 q_L q_R / |W|^2                    psi_L = 1 at the left face, psi_R at the right
    T_Lj = 2 q_L Gamma_phi n^R_j / |W|^2        T_iR = Gamma_phi n^L_i 2 q_R / |W|^2
    T_ij = Gamma_phi^2 n^L_i n^R_j / |W|^2      well i left of well j

which all are (something of the left one) x (something of the right one). This form survives when a
probe is taken out by the star-mesh rule ``T_ij += T_ip T_pj / sum_q T_pq``, so that the network
costs a few additions a well. Nothing is ever subtracted: not in the network, not in the contents
(`_content`), not in the flux, which is the outgoing one plus what the wells take. Hence T <= 1 to
rounding, however small or large Gamma_phi.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from physics.contacts import Layered
from physics.scattering import NODE_GUARD, contact_flux_eV_nm
from physics.sectors import Expanded, matrices

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
Matrices = Iterable[tuple[int, NDArray[Any]]]

KEPT_ELEMENTS = 1_000_000
"""Matrix elements (16 MB) up to which those of one pass are kept for the other."""


@dataclass(frozen=True, eq=False)
class Carried:
    """A contact's outgoing state at the opposite face; arrays have the shape of the energies."""

    ratio_real: FloatArray
    """Re of the outward f / psi at the opposite face, eV nm."""
    ratio_imag: FloatArray
    log_size: FloatArray
    """Logarithm of |psi|^2 there, psi = 1 at the contact's own face."""
    log_content: dict[int, FloatArray]
    """For each well, the logarithm of the integral of |psi|^2 in nm."""


def log_transmissions(
    profile: Layered,
    sectors: Expanded,
    energy_eV: FloatArray,
    width_eV: float,
    well_of_layer: tuple[int, ...],
) -> tuple[FloatArray, FloatArray]:
    """Give the natural logarithms of T_LR and of T by all ways, in the shape of the energies.

    Parameters
    ----------
    sectors : Sectors
        Cut for these energies and a depth of half the width.
    energy_eV : ndarray, any shape
        Real energies.
    width_eV : float
        Gamma_phi, above 0.
    well_of_layer : tuple of int
        For each layer the number of its well, from 0 on the left, at least one; -1 outside.

    Returns
    -------
    coherent, total : ndarray
        -inf where a contact is closed.
    """
    # A piece outside the layers, as a contact's own, has the index -1 or that behind the last one.
    well = np.append(well_of_layer, -1)[profile.layer_index[sectors.piece_index]]
    q_left = contact_flux_eV_nm(profile, 0, energy_eV)
    q_right = contact_flux_eV_nm(profile, 1, energy_eV)
    rightwards, leftwards = _both_ways(sectors, energy_eV, width_eV, well >= 0)
    from_left = _carry(q_left, rightwards, well, 0.5 * width_eV, is_mirrored=True)
    from_right = _carry(q_right, leftwards, well, 0.5 * width_eV, is_mirrored=False)
    both_open = (q_left > 0.0) & (q_right > 0.0)
    x, y = from_right.ratio_real, from_right.ratio_imag
    with np.errstate(divide="ignore", invalid="ignore"):
        log_w = from_right.log_size + np.log((q_left + y) ** 2 + x**2)
        give, take = np.log(2.0 * q_left), np.log(2.0 * q_right) - log_w
        wells = sorted(from_left.log_content)
        gives = [math.log(width_eV) + from_left.log_content[n] for n in wells]
        takes = [math.log(width_eV) + from_right.log_content[n] - log_w for n in wells]
        total = _through_network(give, gives, takes, take)
    closed = -np.inf
    return np.where(both_open, give + take, closed), np.where(both_open, total, closed)


def _through_network(
    give: FloatArray, gives: list[FloatArray], takes: list[FloatArray], take: FloatArray
) -> FloatArray:
    """Take the probes out of the network, from left to right; all values are logarithms.

    Between a terminal and one to the right of it passes ``give x take``. When the leftmost probe p
    goes, ``give_i`` of every later terminal gains ``take_i give_p^2 / (all that leaves p)``, and
    that of the left contact the factor ``1 + give_p take_p / (all that leaves p)``.
    """
    beyond = [take]
    for one in reversed(takes[1:]):
        beyond.append(np.logaddexp(beyond[-1], one))
    gained = np.full_like(take, -np.inf)
    for own, takes_p, rest in zip(gives, takes, reversed(beyond), strict=True):
        gives_p = np.logaddexp(own, gained + takes_p)
        leaves = np.logaddexp(give + takes_p, gives_p + rest)
        give = give + np.logaddexp(0.0, gives_p + takes_p - leaves)
        gained = np.logaddexp(gained, 2.0 * gives_p - leaves)
    return give + take


def well_matrices(
    sectors: Expanded,
    energy_eV: FloatArray,
    gamma_phi_eV: float,
    is_well: NDArray[np.bool_],
    *,
    forward: bool = False,
) -> Iterator[tuple[int, NDArray[Any]]]:
    """As `sectors.matrices`: complex at E + i Gamma_phi / 2 in wells, real at E elsewhere.

    Parameters
    ----------
    is_well : ndarray of bool, shape (S,)
        Which sectors lie in wells.
    """
    plain = matrices(sectors.some(~is_well), energy_eV, forward=forward)
    raised = np.asarray(energy_eV + 0.5j * gamma_phi_eV, dtype=np.complex128)
    lossy = matrices(sectors.some(is_well), raised, forward=forward)
    order = range(sectors.count)
    for index in order if forward else reversed(order):
        yield index, next(lossy if is_well[index] else plain)[1]


def _both_ways(
    sectors: Expanded, energy_eV: FloatArray, width_eV: float, is_well: NDArray[np.bool_]
) -> tuple[Matrices, Matrices]:
    """Give the matrices from the first sector to the last, and back."""
    there = well_matrices(sectors, energy_eV, width_eV, is_well, forward=True)
    if 4 * sectors.count * energy_eV.size > KEPT_ELEMENTS:
        return there, well_matrices(sectors, energy_eV, width_eV, is_well)
    kept = list(there)
    return kept, reversed(kept)


def _carry(
    q: FloatArray,
    each: Matrices,
    well: NDArray[np.int64],
    half_eV: float,
    *,
    is_mirrored: bool,
) -> Carried:
    """Carry the outgoing (closed: decaying) state of a contact of flux q to the opposite face.

    From the left contact the stack is seen in a mirror: the flux turns its sign, and each
    sector's matrix swaps a and d.
    """
    x, y = np.where(q < 0.0, q, 0.0), np.where(q > 0.0, q, 0.0)
    log_size = np.zeros_like(q)
    log_content: dict[int, FloatArray] = {}
    for index, (a, b, c, d) in each:
        turned = (d, b, c, a) if is_mirrored else (a, b, c, d)
        if well[index] < 0:
            x, y, size = _plain_step(turned, x, y)
            log_size = log_size + np.log(size)
            continue
        x, y, size, content = _lossy_step(turned, x, y, half_eV)
        log_size = log_size + np.log(size)
        here = np.log(content) + log_size
        before = log_content.get(int(well[index]))
        log_content[int(well[index])] = here if before is None else np.logaddexp(before, here)
    return Carried(x, y, log_size, log_content)


def _plain_step(
    matrix: tuple[NDArray[Any], ...], x: FloatArray, y: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Carry the ratio x + iy to a lossless sector's left face; also |psi(left) / psi(right)|^2."""
    a, b, c, d = matrix
    by = b * y
    w = d - b * x + NODE_GUARD * d
    size = w * w + by * by
    return ((a * x - c) * w - a * by * y) / size, y / size, size


def _lossy_step(
    matrix: tuple[NDArray[Any], ...], x: FloatArray, y: FloatArray, half_eV: float
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """As `_plain_step` in a well; also the integral of |psi|^2 over |psi(left)|^2.

    The flux at the left face is that at the right face and Gamma_phi / 2 times the integral.
    """
    a, b, c, d = matrix
    ratio = x + 1j * y
    w = d - b * ratio + NODE_GUARD * d
    size = w.real**2 + w.imag**2
    ratio = (a * ratio - c) / w
    content = _content(matrix, ratio, half_eV)
    return ratio.real, y / size + half_eV * content, size, content


def _content(matrix: tuple[NDArray[Any], ...], ratio: ComplexArray, half_eV: float) -> FloatArray:
    """Integral of |psi|^2 over a sector at E + i h, for psi = 1, f = ratio at its left face.

    From ``d/dx (u* f_w - f_u* w) = -2ih u* w`` for solutions u, w. A matrix element is a real
    polynomial of the energy, so that its imaginary part over h is known to full accuracy however
    small h is, and goes over into the derivative: no difference of near values is taken.
    """
    a, b, c, d = matrix
    sa, sb, sc, sd = (element.imag / half_eV for element in matrix)
    mixed = (sa * d - sc * b) * ratio
    first, last = sa * c.real - sc * a.real, sb * d.real - sd * b.real
    content: FloatArray = first + 2.0 * mixed.real + last * (ratio.real**2 + ratio.imag**2)
    return content
