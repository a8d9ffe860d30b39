"""Lost coherence: how wide it makes the levels, where it acts, and what gets through.

Coherence is lost in the wells, where an electron stays; in the barriers and in the contacts'
spacers it is kept. `probes` has the method, after M. Buttiker, IBM J. Res. Dev. 32, 63 (1988).
For one isolated level of partial widths Gamma_L and Gamma_R it gives::

    T(E) = (Gamma_L Gamma_R / Gamma) (Gamma + g) / ((E - E_r)^2 + ((Gamma + g) / 2)^2)

with g = Gamma_phi times the part of the state in wells: the area is kept, the peak falls by
Gamma / (Gamma + g) (A. D. Stone and P. A. Lee, Phys. Rev. Lett. 54, 1196 (1985), from memory).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from physics.constants import ELECTRON_MASS_KG, ELEMENTARY_CHARGE_C, HBAR_EV_S
from physics.errors import StructureError
from physics.field import SAME_EDGE_EV, Profile
from physics.probes import log_transmissions
from physics.ranges import DEPHASING_EV, MASS, MOBILITY_CM2_VS, SCATTERING_TIME_S, Range
from physics.scattering import ENERGIES_AT_ONCE, scatter, scatter_through
from physics.sectors import Sectors, cut
from physics.structure import Structure

FloatArray = NDArray[np.float64]


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


COHERENT = Dephasing()
"""No coherence is lost."""


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
    """Give each layer the number of its well, from 0 on the left; -1 outside all wells.

    By the described edges (a graded layer's mean), no bias: a layer belongs to a well if a higher
    layer stands somewhere on each of its sides and it does not rise above both its neighbours,
    which makes it a barrier between wells. Spacers outside the outermost barriers are no wells.
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
    well_of_layer = wells_of(structure)
    if not Dephasing(gamma_phi_eV, well_of_layer).acts:
        plain = scatter(profile, energy)
        through = plain.transmission
        return Dephased(energy, through, through, plain.reflection, plain.log10_transmission)
    low, high = float(energy.min()), float(energy.max())
    sectors = cut(profile, low, high, depth_eV=0.5 * gamma_phi_eV)
    chunks = [energy[n : n + ENERGIES_AT_ONCE] for n in range(0, energy.size, ENERGIES_AT_ONCE)]
    logs = [
        log_transmissions(profile, sectors, chunk, gamma_phi_eV, well_of_layer) for chunk in chunks
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
    if not Dephasing(gamma_phi_eV, well_of_layer).acts:
        return scatter_through(profile, sectors, energy_eV).transmission
    return np.exp(log_transmissions(profile, sectors, energy_eV, gamma_phi_eV, well_of_layer)[1])
