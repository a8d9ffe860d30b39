"""Lost coherence: transmission with a voltage probe in every well.

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
from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from physics.constants import ELECTRON_MASS_KG, ELEMENTARY_CHARGE_C, HBAR_EV_S
from physics.errors import StructureError
from physics.field import SAME_EDGE_EV, Profile
from physics.ranges import DEPHASING_EV, MASS, MOBILITY_CM2_VS, SCATTERING_TIME_S, Range
from physics.scattering import ENERGIES_AT_ONCE, NODE_GUARD, contact_flux_eV_nm, scatter_through
from physics.sectors import Sectors, cut, matrices
from physics.structure import Structure

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


@dataclass(frozen=True)
class Dephasing:
    """How fast coherence is lost, and where."""

    width_eV: float = 0.0
    """Gamma_phi: hbar over the time in which a wave in a well loses its phase."""
    well_of_layer: tuple[int, ...] = ()
    """For each layer the number of its well, from 0; -1 outside all wells."""

    @property
    def acts(self) -> bool:
        """Whether it changes anything: there is a width, and a well that it acts in."""
        return self.width_eV > 0.0 and any(well >= 0 for well in self.well_of_layer)

    def of_level_eV(self, share_by_layer: tuple[float, ...]) -> float:
        """Width that a level gains: Gamma_phi times the part of its state that is in wells."""
        if not self.acts:
            return 0.0
        pairs = zip(self.well_of_layer, share_by_layer, strict=True)
        return self.width_eV * math.fsum(share for well, share in pairs if well >= 0)


@dataclass(frozen=True, eq=False)
class Dephased:
    """What gets through with lost coherence; every array has the shape of the energies."""

    energy_eV: FloatArray
    transmission: FloatArray
    """Flux transmitted over flux incident, by all ways; 0 where either contact is closed."""
    coherent_transmission: FloatArray
    """The part of it that has kept its phase all the way (T_LR)."""
    reflection: FloatArray
    """1 - transmission."""
    log10_transmission: FloatArray
    """Decadic logarithm of the transmission, also where the number itself underflows."""


@dataclass(frozen=True, eq=False)
class _Carried:
    """A contact's outgoing state at the opposite face; arrays have the shape of the energies."""

    ratio_real: FloatArray
    """Re of the outward f / psi at the opposite face, eV nm."""
    ratio_imag: FloatArray
    log_size: FloatArray
    """Logarithm of |psi|^2 there, psi = 1 at the contact's own face."""
    log_content: dict[int, FloatArray]
    """For each well, the logarithm of the integral of |psi|^2 in nm."""


def dephasing_eV(
    *,
    scattering_time_s: float | None = None,
    mobility_cm2_Vs: float | None = None,
    mass: float | None = None,
) -> float:
    """Give the width that a scattering time or a mobility stands for.

    ``Gamma_phi = hbar / tau`` with ``tau = mobility x mass / e`` (P. Drude, Ann. Phys. 306, 566
    (1900), from memory). The mobility's time counts how often the direction is lost; that the
    phase is lost as often, and no more, is an assumption.

    Parameters
    ----------
    scattering_time_s, mobility_cm2_Vs : float, optional
        One of the two.
    mass : float, optional
        Mass in m0 that goes with the mobility.

    Raises
    ------
    StructureError
        Not exactly one is given, or it lies outside its range, or the width does.
    """
    if (scattering_time_s is None) == (mobility_cm2_Vs is None):
        allowed = "give scattering_time_s or mobility_cm2_Vs"
        raise StructureError("conditions", "scattering_time_s", scattering_time_s, allowed)
    if scattering_time_s is not None:
        return HBAR_EV_S / _held("scattering_time_s", scattering_time_s, SCATTERING_TIME_S)
    mobility = _held("mobility_cm2_Vs", mobility_cm2_Vs, MOBILITY_CM2_VS)
    carrier = _held("mass", mass, MASS)
    time_s = 1e-4 * mobility * carrier * (ELECTRON_MASS_KG / ELEMENTARY_CHARGE_C)
    width = HBAR_EV_S / time_s
    if not DEPHASING_EV.holds(width):
        allowed = f"with a mass of {carrier:g} it makes {width:.3g} eV; {DEPHASING_EV.allowed}"
        raise StructureError("conditions", "mobility_cm2_Vs", mobility, allowed)
    return width


def _held(key: str, value: float | None, allowed: Range) -> float:
    if value is None or not allowed.holds(value):
        raise StructureError("conditions", key, value, allowed.allowed)
    return value


def wells_of(structure: Structure) -> tuple[int, ...]:
    """Number the wells of a stack: for each layer its well, from 0 on the left; -1 outside.

    By the described edges (a graded layer's mean), no bias: a layer belongs to a well if a higher
    layer stands somewhere on each of its sides and it does not rise above both its neighbours, which
    makes it a barrier between two wells. Spacers outside the outermost barriers are no wells.
    """
    edges = [0.5 * (layer.edge_eV + layer.right_edge_eV) for layer in structure.layers]
    highest_left = np.maximum.accumulate([-math.inf, *edges[:-1]])
    highest_right = np.maximum.accumulate([-math.inf, *edges[:0:-1]])[::-1]
    lower = np.array(edges) < np.minimum(highest_left, highest_right) - SAME_EDGE_EV
    inside = lower & ~_rises(edges)
    starts = inside & ~np.append(False, inside[:-1])
    return tuple(int(n) for n in np.where(inside, np.cumsum(starts) - 1, -1))


def _rises(edges: list[float]) -> NDArray[np.bool_]:
    """Mark layers that, with neighbours of equal edge, rise above what is on both their sides."""
    steps = [0, *(n for n, (a, b) in enumerate(pairwise(edges), 1) if abs(b - a) > SAME_EDGE_EV)]
    rises = np.zeros(len(edges), dtype=bool)
    for first, end in pairwise([*steps, len(edges)]):
        left = edges[first - 1] if first else math.inf
        right = edges[end] if end < len(edges) else math.inf
        rises[first:end] = edges[first] > max(left, right)
    return rises


def scatter_dephased(
    profile: Profile, structure: Structure, energy_eV: FloatArray, gamma_phi_eV: float
) -> Dephased:
    """Solve the scattering problem with lost coherence.

    Parameters
    ----------
    profile : Profile
        Edges and masses over position.
    structure : Structure
        The layers it was made from, which say where the wells are.
    energy_eV : ndarray, shape (E,)
        Energies, on the profile's scale, in any order.
    gamma_phi_eV : float
        Gamma_phi; for 0, and where there is no well, T is that of `scattering`, to the last bit.

    Raises
    ------
    StructureError
        The width is out of its range, or the stack is too thick for these energies.
    """
    _held("dephasing_eV", gamma_phi_eV, DEPHASING_EV)
    energy = np.atleast_1d(np.asarray(energy_eV, dtype=np.float64))
    low, high = float(energy.min()), float(energy.max())
    dephasing = Dephasing(gamma_phi_eV, wells_of(structure))
    depth = 0.5 * gamma_phi_eV if dephasing.acts else 0.0
    sectors = cut(profile, low, high, depth_eV=depth)
    logs = [
        _log_transmissions(profile, sectors, energy[first : first + ENERGIES_AT_ONCE], dephasing)
        for first in range(0, energy.size, ENERGIES_AT_ONCE)
    ]
    coherent, total = (np.concatenate(parts) for parts in zip(*logs, strict=True))
    through = np.exp(total)
    return Dephased(energy, through, np.exp(coherent), 1.0 - through, total / math.log(10.0))


def effective_transmission(
    profile: Profile,
    sectors: Sectors,
    energy_eV: FloatArray,
    gamma_phi_eV: float,
    well_of_layer: tuple[int, ...],
) -> FloatArray:
    """Transmission by all ways, in the shape of the energies.

    Parameters
    ----------
    sectors : Sectors
        Cut for these energies and a depth of Gamma_phi / 2.
    gamma_phi_eV : float
        Gamma_phi, not below 0.
    well_of_layer : tuple of int
        As `wells_of` gives it.
    """
    dephasing = Dephasing(gamma_phi_eV, well_of_layer)
    return np.exp(_log_transmissions(profile, sectors, energy_eV, dephasing)[1])


def log10_effective(
    profile: Profile, sectors: Sectors, energy_eV: FloatArray, dephasing: Dephasing
) -> FloatArray:
    """Decadic logarithm of `effective_transmission`, -inf where a contact is closed."""
    log_t = _log_transmissions(profile, sectors, energy_eV, dephasing)[1]
    return log_t / math.log(10.0)


def _log_transmissions(
    profile: Profile, sectors: Sectors, energy_eV: FloatArray, dephasing: Dephasing
) -> tuple[FloatArray, FloatArray]:
    """Natural logarithm of T_LR and of T by all ways, in the shape of the energies."""
    if not dephasing.acts:
        log_t = scatter_through(profile, sectors, energy_eV).log10_transmission * math.log(10.0)
        return log_t, log_t
    layer = profile.layer_index[sectors.piece_index]
    well = np.array(dephasing.well_of_layer)[layer]
    width = dephasing.width_eV
    from_left = _carry(profile, sectors, energy_eV, width, well, 0)
    from_right = _carry(profile, sectors, energy_eV, width, well, 1)
    q_left = contact_flux_eV_nm(profile, 0, energy_eV)
    q_right = contact_flux_eV_nm(profile, 1, energy_eV)
    both_open = (q_left > 0.0) & (q_right > 0.0)
    x, y = from_right.ratio_real, from_right.ratio_imag
    with np.errstate(divide="ignore", invalid="ignore"):
        log_w = from_right.log_size + np.log((q_left + y) ** 2 + x**2)
        give, take = np.log(2.0 * q_left), np.log(2.0 * q_right) - log_w
        wells = sorted(from_left.log_content)
        gives = [math.log(width) + from_left.log_content[n] for n in wells]
        takes = [math.log(width) + from_right.log_content[n] - log_w for n in wells]
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
    sectors: Sectors,
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
    plain = matrices(_some(sectors, ~is_well), energy_eV, forward=forward)
    lossy = matrices(_some(sectors, is_well), energy_eV + 0.5j * gamma_phi_eV, forward=forward)
    order = range(sectors.count)
    for index in order if forward else reversed(order):
        yield index, next(lossy if is_well[index] else plain)[1]


def _some(sectors: Sectors, chosen: NDArray[np.bool_]) -> Sectors:
    return replace(sectors, piece_index=sectors.piece_index[chosen], kind=sectors.kind[chosen])


def _carry(
    profile: Profile,
    sectors: Sectors,
    energy_eV: FloatArray,
    width_eV: float,
    well: NDArray[np.int64],
    side: int,
) -> _Carried:
    """Carry the outgoing (closed: decaying) state of a contact to the opposite face.

    From the left contact the stack is seen in a mirror: the flux turns its sign, and each
    sector's matrix swaps a and d.
    """
    q = contact_flux_eV_nm(profile, side, energy_eV)
    x, y = np.where(q < 0.0, q, 0.0), np.where(q > 0.0, q, 0.0)
    log_size = np.zeros_like(q)
    log_content: dict[int, FloatArray] = {}
    each = well_matrices(sectors, energy_eV, width_eV, well >= 0, forward=side == 0)
    for index, (a, b, c, d) in each:
        turned = (a, b, c, d) if side else (d, b, c, a)
        if well[index] < 0:
            x, y, size = _plain_step(turned, x, y)
            log_size = log_size + np.log(size)
            continue
        x, y, size, content = _lossy_step(turned, x, y, 0.5 * width_eV)
        log_size = log_size + np.log(size)
        here = np.log(content) + log_size
        before = log_content.get(int(well[index]))
        log_content[int(well[index])] = here if before is None else np.logaddexp(before, here)
    return _Carried(x, y, log_size, log_content)


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
