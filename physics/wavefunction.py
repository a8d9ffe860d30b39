"""Density of scattering states and levels, and the local density of states.

Where the mass goes with the energy, densities hold the valence component ``(b/c) |f|^2`` as well
as |psi|^2, and step where the mass slope b does.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C_EV_NM2
from physics.errors import EnergyError, StructureError
from physics.field import Profile, require_above_valence
from physics.leaving import STOPS, carry_from, density, leaving_states
from physics.levels import Level
from physics.outgoing import Sheet
from physics.scattering import NODE_GUARD, contact_flux_eV_nm
from physics.sectors import Sectors, all_matrices, cut, matrices

ComplexArray = NDArray[np.complex128]
FloatArray = NDArray[np.float64]

FROM_LEFT = "incident from the left"
FROM_RIGHT = "incident from the right"
ONE_ELECTRON = "one electron in the stack"


@dataclass(frozen=True, eq=False)
class Density:
    """Probability density of one state over position; arrays have shape (X,)."""

    x_nm: FloatArray
    edge_eV: FloatArray
    density_per_nm: FloatArray
    energy_eV: float
    norm: str
    """`FROM_LEFT` / `FROM_RIGHT`: unit density of the incident wave; `ONE_ELECTRON`: unit integral
    (a closed contact's tail included)."""


def scattering_state(profile: Profile, energy_eV: float, points: int = 400) -> Density:
    """Density of the wave that comes in from the left, or from the right if the left is closed.

    Parameters
    ----------
    energy_eV : float
        The energy.
    points : int
        Least number of positions; they are spread evenly over each sector.

    Raises
    ------
    EnergyError
        Both contacts are closed at this energy, or it lies in a valence band.
    """
    require_above_valence(profile, energy_eV)
    energy = np.array([energy_eV])
    q_left, q_right = (float(contact_flux_eV_nm(profile, side, energy)[0]) for side in (0, 1))
    if q_left <= 0.0 and q_right <= 0.0:
        lowest = min(profile.contact_edge_eV)
        raise EnergyError(
            f"both contacts are closed at {energy_eV:g} eV; waves come in above {lowest:g} eV"
        )
    sectors = _cut_for_points(profile, energy_eV, energy_eV, 0.0, points)
    from_left = q_left > 0.0
    leaving, q_in = (q_right, q_left) if from_left else (q_left, q_right)
    out = complex(0.0, leaving) if leaving > 0.0 else complex(leaving, 0.0)
    psi, flux, log_scale = carry_from(
        sectors, energy + 0j, np.array([out if from_left else -out]), from_right=from_left
    )
    face = 0 if from_left else -1
    inward = 1.0 if from_left else -1.0
    incident = 0.5 * abs(psi[face, 0] + inward * flux[face, 0] / (1j * q_in))
    valence = profile.contact_mass_slope[face] / C_EV_NM2 * q_in**2
    scale = log_scale[:, 0] - log_scale[face, 0] - math.log(incident * math.sqrt(1.0 + valence))
    return _density(
        profile,
        sectors,
        energy_eV,
        (psi[:, 0], flux[:, 0], scale),
        FROM_LEFT if from_left else FROM_RIGHT,
    )


def level_state(profile: Profile, level: Level, points: int = 400) -> Density:
    """Density of a level, normalised to one electron.

    Parameters
    ----------
    level : Level
        As `find_levels` returned it for this profile.
    points : int
        Least number of positions; they are spread evenly over each sector.
    """
    half_width = 0.5 * level.width_eV
    energy = np.array([complex(level.energy_eV, -half_width)])
    sectors = _cut_for_points(profile, level.energy_eV, level.energy_eV, half_width, points)
    sheet = Sheet(*(level.energy_eV > edge for edge in profile.contact_edge_eV))
    states = leaving_states(profile, sectors, sheet, energy)
    zero = np.zeros(states.psi.shape[0])
    return _density(
        profile, sectors, energy[0], (states.psi[:, 0], states.flux[:, 0], zero), ONE_ELECTRON
    )


def local_density_of_states(
    profile: Profile, x_nm: FloatArray, energy_eV: FloatArray
) -> FloatArray:
    """Local density of states of the open contacts' waves, per spin, in 1 / (eV nm).

    ``-Im G(x, x; E) / pi`` with ``G = 1 / (eta_right - eta_left)`` from the ratios f / psi of the
    two leaving solutions (E. N. Economou, Green's Functions in Quantum Physics, ch. 1, from
    memory). A mass slope adds the valence component, ``-(b/c) Im(eta_left eta_right G) / pi``, with
    the slope of the piece to the right at a face.
    Bound levels, which no wave reaches, are not part of it.

    Parameters
    ----------
    x_nm : ndarray, shape (X,)
        Positions in the stack.
    energy_eV : ndarray, shape (E,)
        Energies.

    Returns
    -------
    ndarray, shape (X, E)

    Raises
    ------
    StructureError
        A position outside the stack.
    """
    left, right, slope = _both_ratios(profile, x_nm, energy_eV)
    real, imag = right[0] - left[0], right[1] - left[1]
    size = real**2 + imag**2
    waves = imag
    if not profile.is_parabolic:
        # Waves from the left have the right solution's f / psi, and the other way round.
        from_left = left[1] * (right[0] ** 2 + right[1] ** 2)
        from_right = right[1] * (left[0] ** 2 + left[1] ** 2)
        waves = imag + slope / C_EV_NM2 * (from_right - from_left)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(imag > 0.0, waves / size, 0.0) / np.pi


def injected_density_of_states(
    profile: Profile, x_nm: FloatArray, energy_eV: FloatArray
) -> FloatArray:
    """Local density of the states that come in from each contact, per spin, in 1 / (eV nm).

    With the ratios f / psi of the two leaving solutions, ``|G|^2`` times the flux that leaves to
    one side is what that side brings in (S. Datta, Electronic Transport in Mesoscopic Systems
    (1995), ch. 3, from memory). It equals ``|psi|^2 / (2 pi hbar v)`` for a wave of unit density
    and velocity v in that contact.

    Parameters
    ----------
    x_nm : ndarray, shape (X,)
        Positions in the stack.
    energy_eV : ndarray, shape (E,)
        Energies.

    Returns
    -------
    ndarray, shape (2, X, E)
        From the left contact and from the right one.

    Raises
    ------
    StructureError
        A position outside the stack.
    """
    left, right, slope = _both_ratios(profile, x_nm, energy_eV)
    size = (right[0] - left[0]) ** 2 + (right[1] - left[1]) ** 2
    flux = np.stack([-left[1], right[1]])
    valence = np.stack([right[0] ** 2 + right[1] ** 2, left[0] ** 2 + left[1] ** 2])
    density = flux * (1.0 + slope / C_EV_NM2 * valence)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(flux > 0.0, density / size, 0.0) / np.pi


def _both_ratios(
    profile: Profile, x_nm: FloatArray, energy_eV: FloatArray
) -> tuple[tuple[FloatArray, FloatArray], tuple[FloatArray, FloatArray], FloatArray]:
    """Ratios f / psi of the solutions that leave to the left and to the right, as `_ratios`.

    And the mass slope at each position, shape (X, 1).
    """
    x = np.asarray(x_nm, dtype=np.float64)
    energy = np.atleast_1d(np.asarray(energy_eV, dtype=np.float64))
    if x.size == 0 or not (x.min() >= profile.start_nm and x.max() <= profile.end_nm):
        allowed = f"positions lie between {profile.start_nm:g} and {profile.end_nm:g} nm"
        raise StructureError("profile", "x_nm", x.tolist()[:3], allowed)
    sectors = cut(profile, float(energy.min()), float(energy.max()), marks_nm=x)
    face = _nearest_face(sectors, x)
    right = _ratios(profile, sectors, energy, face, from_right=True)
    left = _ratios(profile, sectors, energy, face, from_right=False)
    slope = np.append(sectors.mass_slope[0], sectors.mass_slope[1, -1])[face][:, None]
    return left, right, slope


def _ratios(
    profile: Profile,
    sectors: Sectors,
    energy: FloatArray,
    face: NDArray[np.int64],
    *,
    from_right: bool,
) -> tuple[FloatArray, FloatArray]:
    """Real and imaginary part of f / psi of a leaving solution at given faces, each (X, E)."""
    sign = 1.0 if from_right else -1.0
    q = contact_flux_eV_nm(profile, 1 if from_right else 0, energy)
    x, y = sign * np.where(q < 0.0, q, 0.0), sign * np.where(q > 0.0, q, 0.0)
    real, imag = np.empty((face.size, energy.size)), np.empty((face.size, energy.size))
    start = sectors.count if from_right else 0
    real[face == start], imag[face == start] = x, y
    for index, (a, b, c, d) in matrices(sectors, energy, forward=not from_right):
        if from_right:
            a, b, c, d = d, -b, -c, a  # noqa: PLW2901  the inverse matrix
        w = a + b * x + NODE_GUARD * a
        size = w * w + (b * y) ** 2
        x, y = ((c + d * x) * w + b * d * y * y) / size, y / size
        here = face == (index if from_right else index + 1)
        real[here], imag[here] = x, y
    return real, imag


def _nearest_face(sectors: Sectors, x: FloatArray) -> NDArray[np.int64]:
    after = np.clip(np.searchsorted(sectors.position_nm, x), 1, sectors.count)
    before_is_nearer = x - sectors.position_nm[after - 1] < sectors.position_nm[after] - x
    return np.where(before_is_nearer, after - 1, after)


def _cut_for_points(
    profile: Profile, low: float, high: float, depth: float, points: int
) -> Sectors:
    """Cut with as many even stops a sector as the wanted number of positions needs."""
    plain = cut(profile, low, high, depth_eV=depth)
    number = max(1, math.ceil(points / plain.count))
    even = tuple((n + 1) / number for n in range(number))
    return cut(profile, low, high, depth_eV=depth, stops=(*STOPS[:-1], *even))


def _density(
    profile: Profile,
    sectors: Sectors,
    energy: complex,
    wave: tuple[ComplexArray, ComplexArray, FloatArray],
    norm: str,
) -> Density:
    """Evaluate a wave, known with its flux at the faces, at the even stops of every sector."""
    psi, flux, log_scale = wave
    even = all_matrices(sectors, np.array([energy]), slice(len(STOPS) - 1, None))  # (P, 4, S, 1)
    stops = sectors.stops[len(STOPS) - 1 :]
    inside = density(sectors, even, psi[:, None], flux[:, None], stops)[..., 0]  # (P, S)
    inside *= np.exp(2.0 * log_scale[:-1])
    valence = sectors.mass_slope[0, 0] / C_EV_NM2 * abs(flux[0]) ** 2
    first = (abs(psi[0]) ** 2 + valence) * math.exp(2.0 * float(log_scale[0]))
    x = sectors.position_nm[:-1] + stops[:, None] * sectors.length_nm
    x = np.append(profile.start_nm, x.T.ravel())
    x[-1] = profile.end_nm
    return Density(
        x, profile.edge_eV(x), np.append(first, inside.T.ravel()), float(np.real(energy)), norm
    )
