"""Electrons between the barriers as waves of both contacts.

``n(x) = int dE sum_c LDOS_c(x, E) m / (pi hbar^2) kT ln(1 + exp((mu_c - E) / kT))``: each wave of
contact c and energy E across the layers is filled to that contact's Fermi level in the two free
directions, with the mass at x. Levels too narrow to be integrated over are summed instead, and
levels below both contacts' edges, which no wave reaches, are filled too.

While the potential is sought the waves are those of a given one, but each moves with the potential
where it is, which is what makes the next waves differ little (predictor and corrector, A. Trellakis
et al., J. Appl. Phys. 81, 7880 (1997), from memory).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from physics.charge import Electrons
from physics.constants import BOLTZMANN_EV_PER_K
from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C_EV_NM2
from physics.field import Profile
from physics.leaving import STOPS, leaving_states
from physics.levels import Level, LevelSet, find_levels, follow_levels
from physics.mesh import Mesh
from physics.newton import on_elements
from physics.outgoing import Sheet
from physics.sectors import cut
from physics.wavefunction import injected_density_of_states

FloatArray = NDArray[np.float64]

REACH_KT = 20.0
"""Energies above the higher Fermi level that still hold electrons: exp(-20) of them."""
NARROW_KT = 0.01
"""Width over kT up to which a level is summed rather than integrated over."""
BROAD_EV = 0.01
"""Width from which a level needs no panels of its own, and longest panel."""
LINE_WIDTHS, LEAST_LINE_EV = 10.0, 1e-8
"""Half the range about a narrow level that its sum stands for: in widths, and at least."""
PANEL_RATIO = 4.0
"""Ratio of the distances from a level, or from a contact's edge, at which panels end."""
GAUSS_SHARE, GAUSS_WEIGHT = np.polynomial.legendre.leggauss(4)


@dataclass(frozen=True, eq=False)
class Waves:
    """What fills the region's N nodes, state by state (J of them) at one potential."""

    energy_eV: FloatArray
    """Shape (J,)."""
    per_nm: FloatArray
    """Probability density of the states filled from the left and from the right contact, energy
    steps included; shape (2, N, J)."""
    base_V: FloatArray
    """The potential they belong to, shape (N,)."""
    remarks: tuple[str, ...]
    """What there is to be said of them."""
    levels: LevelSet
    """The levels that were told apart."""


def region_elements(mesh: Mesh) -> slice:
    """Elements of the tunnelling region; empty where there is no barrier."""
    inside = np.flatnonzero(mesh.side == 0)
    return slice(int(inside[0]), int(inside[-1]) + 1) if inside.size else slice(0, 0)


def waves_of(
    mesh: Mesh,
    profile: Profile,
    potential_V: FloatArray,
    fermi_eV: tuple[float, float],
    near: Waves | None = None,
) -> Waves:
    """Compute the waves that fill the region.

    Parameters
    ----------
    mesh : Mesh
        The elements.
    profile : Profile
        The band edge at this potential.
    potential_V : ndarray, shape (2 E + 1,)
        The potential at all nodes.
    fermi_eV : tuple of float
        Fermi level of the left and of the right contact.
    near : Waves, optional
        Those of a potential that is all but the same; their levels are followed.

    Raises
    ------
    EnergyError
        More levels than can be computed in reasonable time.
    """
    elements = region_elements(mesh)
    nodes = slice(2 * elements.start, 2 * elements.stop + 1)
    x = mesh.node_nm[nodes]
    kT = BOLTZMANN_EV_PER_K * mesh.temperature_K
    top = max(*fermi_eV, min(profile.contact_edge_eV)) + REACH_KT * kT
    if near is None:
        levels = find_levels(profile, profile.lowest_eV - BROAD_EV, top, BROAD_EV)
    else:
        levels = follow_levels(profile, near.levels)
    remarks = [] if levels.complete else ["the count of the levels that hold them is not proved"]
    bound = [level for level in levels.levels if level.kind == "bound"]
    if bound and fermi_eV[0] != fermi_eV[1]:
        remarks.append("levels below both contacts' edges filled to the lower Fermi level")
    narrow = [
        level
        for level in levels.levels
        if level.kind == "quasi-bound" and 0.0 < level.width_eV < NARROW_KT * kT
    ]
    lines = merged_lines(narrow)
    energy, weight = _energies(profile, levels, lines, fermi_eV, top_eV=top, kT_eV=kT)
    spread = injected_density_of_states(profile, x, energy) * weight
    summed = [_line(profile, x, level, lines) for level in narrow]
    filled = 0 if fermi_eV[0] <= fermi_eV[1] else 1
    summed += [_bound(profile, x, level, filled) for level in bound]
    return Waves(
        energy_eV=np.append(energy, [level.energy_eV for level in [*narrow, *bound]]),
        per_nm=np.concatenate([spread, *(part[:, :, None] for part in summed)], axis=2),
        base_V=potential_V[nodes],
        remarks=tuple(remarks),
        levels=levels,
    )


def wave_electrons(
    mesh: Mesh, waves: Waves, outside: Electrons, fermi_eV: tuple[float, float]
) -> Electrons:
    """Add the waves' electrons in the region to those that are outside of it."""
    kT = BOLTZMANN_EV_PER_K * mesh.temperature_K
    elements = region_elements(mesh)
    per_eV_nm2 = mesh.mass[elements] / (2.0 * math.pi * C_EV_NM2)  # m / (pi hbar^2), (R, 3)
    base = [(level - waves.energy_eV) / kT for level in fermi_eV]

    def electrons(potential_V: FloatArray) -> tuple[FloatArray, FloatArray]:
        count, rate = outside(potential_V)
        node = np.append(potential_V[elements, :2].ravel(), potential_V[elements.stop - 1, 2])
        lowered = ((node - waves.base_V) / kT)[:, None]
        filling, slope = np.zeros_like(node), np.zeros_like(node)
        for side in (0, 1):
            above = np.logaddexp(0.0, base[side] + lowered)
            filling += kT * (waves.per_nm[side] * above).sum(axis=1)
            slope += (waves.per_nm[side] * -np.expm1(-above)).sum(axis=1)
        count[elements] = per_eV_nm2 * on_elements(filling)
        rate[elements] = per_eV_nm2 * on_elements(slope)
        return count, rate

    return electrons


def split_waves(waves: Waves) -> Waves:
    """Give the same waves on elements of half the length, by parabolas through each three nodes."""
    base, per_nm = _split(waves.base_V[:, None])[:, 0], [_split(part) for part in waves.per_nm]
    return replace(waves, per_nm=np.maximum(np.stack(per_nm), 0.0), base_V=base)


def _split(value: FloatArray) -> FloatArray:
    """From (2 R + 1, J) values at nodes to (4 R + 1, J)."""
    left, middle, right = value[:-1:2], value[1::2], value[2::2]
    result = np.empty((2 * value.shape[0] - 1, value.shape[1]))
    result[::2] = value
    result[1::4] = 0.375 * left + 0.75 * middle - 0.125 * right
    result[3::4] = 0.375 * right + 0.75 * middle - 0.125 * left
    return result


def merged_lines(narrow: list[Level]) -> list[tuple[float, float]]:
    """Ranges of energy that narrow levels' sums stand for, overlapping ones made one."""
    lines: list[tuple[float, float]] = []
    for level in narrow:
        half = max(LINE_WIDTHS * level.width_eV, LEAST_LINE_EV)
        low, high = level.energy_eV - half, level.energy_eV + half
        if lines and low <= lines[-1][1]:
            low, high = lines[-1][0], max(lines[-1][1], high)
            lines.pop()
        lines.append((low, high))
    return lines


def _energies(
    profile: Profile,
    levels: LevelSet,
    lines: list[tuple[float, float]],
    fermi_eV: tuple[float, float],
    *,
    top_eV: float,
    kT_eV: float,
) -> tuple[FloatArray, FloatArray]:
    """Gauss's energies and weights on panels cut at levels, contact edges and Fermi levels."""
    bottom = min(profile.contact_edge_eV)
    ends = [np.linspace(bottom, top_eV, 2 + int((top_eV - bottom) / BROAD_EV))]
    ends += [edge + _graded(1e-7) for edge in profile.contact_edge_eV]
    fine = kT_eV * np.array([0.5, 1.0, 2.0, 3.0, 4.5, 6.0, 8.0, 10.0, 13.0, 16.0])
    ends += [level + np.concatenate([-fine, [0.0], fine]) for level in fermi_eV]
    for low, high in lines:
        distance = _graded(0.5 * (high - low))[1:]
        ends += [low + distance[:1] - distance, high - distance[:1] + distance]
    for level in levels.levels:
        if level.kind == "quasi-bound" and level.width_eV >= NARROW_KT * kT_eV:
            distance = _graded(0.5 * level.width_eV)
            ends += [level.energy_eV + distance, level.energy_eV - distance]
    face = np.unique(np.concatenate(ends))
    face = face[(face >= bottom) & (face <= top_eV)]
    middle, half = 0.5 * (face[1:] + face[:-1]), 0.5 * np.diff(face)
    kept = half > 0.0
    for low, high in lines:
        kept &= (middle < low) | (middle > high)
    energy = middle[kept, None] + half[kept, None] * GAUSS_SHARE
    return energy.ravel(), (half[kept, None] * GAUSS_WEIGHT).ravel()


def _graded(first_eV: float) -> FloatArray:
    """0, a first distance and larger ones up to `BROAD_EV`."""
    count = math.ceil(math.log(max(BROAD_EV / first_eV, 1.0)) / math.log(PANEL_RATIO))
    return np.append(0.0, first_eV * PANEL_RATIO ** np.arange(count + 1))


def _line(
    profile: Profile, x_nm: FloatArray, level: Level, lines: list[tuple[float, float]]
) -> FloatArray:
    """Density of a narrow level by what fills it, shape (2, N)."""
    low, high = next(line for line in lines if line[0] <= level.energy_eV <= line[1])
    half = 0.5 * level.width_eV
    part = math.atan((high - level.energy_eV) / half) - math.atan((low - level.energy_eV) / half)
    share = np.array([level.left_width_eV, level.right_width_eV]) / level.width_eV
    return (part / math.pi) * share[:, None] * _density(profile, x_nm, level)


def _bound(profile: Profile, x_nm: FloatArray, level: Level, filled: int) -> FloatArray:
    """Density of a level that no wave reaches, under the contact that fills it, shape (2, N)."""
    share = np.array([0.0, 0.0])
    share[filled] = 1.0
    return share[:, None] * _density(profile, x_nm, level)


def _density(profile: Profile, x_nm: FloatArray, level: Level) -> FloatArray:
    """Density of one electron in a level at given nodes, shape (N,)."""
    half = 0.5 * level.width_eV
    sectors = cut(
        profile, level.energy_eV, level.energy_eV, depth_eV=half, marks_nm=x_nm, stops=STOPS
    )
    sheet = Sheet(*(level.energy_eV > edge for edge in profile.contact_edge_eV))
    states = leaving_states(profile, sectors, sheet, np.array([complex(level.energy_eV, -half)]))
    density: FloatArray = np.interp(x_nm, sectors.position_nm, np.abs(states.psi[:, 0]) ** 2)
    return density
