"""Current over bias: on given biases, or on biases that follow the curve's own features.

A `Drive` says how a bias turns into a profile; the field model is its matter, not the curve's.
Biases are computed side by side, a chunk at a time (`family`), outward from the one nearest zero.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from physics.constants import BOLTZMANN_EV_PER_K
from physics.current import Currents, tsu_esaki
from physics.dephasing import COHERENT, Dephasing
from physics.errors import StructureError
from physics.family import family_of
from physics.field import Profile, go_on
from physics.structure import Structure

FloatArray = NDArray[np.float64]

CHUNK = 26
"""Biases computed side by side: arrays that stay in the cache."""
FIRST_POINTS = 41
"""Evenly spaced biases that a curve of its own grid begins with."""
MOST_POINTS = 401
HALVINGS = 5
STRAIGHT = 0.004
"""Departure from a straight line, as a share of the curve's range or of the current itself, up to
which a step in bias is left alone."""
CLOSE_V = 2e-4
"""Distance of the biases that give a slope: far below a level's or kT's share of a curve, far above
what the error of a current makes of it."""
CLOSEST_V = 1e-7
"""But not closer: there the error of a current would show."""
DECIMALS = 12
"""Decimals of a bias in V that is chosen here."""
FAINT = 0.2
"""The same as a share of what is around: where little current flows, features are sought too."""
ABOUT_ZERO_KT = (0.003, 0.03, 0.3)
"""Biases about zero, in kT, where levels of like wells are aligned."""
STENCIL = 5
"""Points through which a polynomial is laid for the slope."""


@dataclass(frozen=True)
class Drive:
    """A structure at a temperature, and what its bands are at a bias."""

    structure: Structure
    temperature_K: float
    profiles: Callable[[FloatArray], Sequence[Profile]]
    """Profiles of like pieces at biases of shape (B,)."""
    watch: Callable[[], None] = go_on
    dephasing: Dephasing = COHERENT
    """How coherence is lost."""

    @property
    def mu_left_eV(self) -> float:
        """Fermi energy of the left contact.

        Raises
        ------
        StructureError
            No current can be computed without the contacts' Fermi energies.
        """
        left = self.structure.left
        if left.fermi_eV is None:
            allowed = (
                "a current needs the contacts' electrons: state donors_cm3 or fermi_eV of both"
            )
            raise StructureError("left", "fermi_eV", None, allowed)
        return left.edge_eV + left.fermi_eV


@dataclass(frozen=True, eq=False)
class Curve:
    """Currents over bias, sorted by bias; arrays (B,) and (B, R), rows filled up with nan."""

    bias_V: FloatArray
    current_density_A_per_cm2: FloatArray
    error_A_per_cm2: FloatArray
    reached: NDArray[np.bool_]
    """Whether the stated accuracy was reached."""
    level_eV: FloatArray
    """Energies of the levels that current can go through."""
    level_width_eV: FloatArray
    level_current_A_per_cm2: FloatArray
    """Current at energies nearer to a level than to any other."""

    @property
    def conductance_S_per_cm2(self) -> FloatArray:
        """Slope dJ/dV at each bias, of the polynomial through the five points nearest to it."""
        return slopes(self.bias_V, self.current_density_A_per_cm2)


def curve_at(drive: Drive, bias_V: FloatArray) -> Curve:
    """Compute the current at given biases.

    Parameters
    ----------
    bias_V : ndarray, shape (B,)
        In any order; the curve has them sorted, each once.

    Raises
    ------
    StructureError
        A contact's Fermi energy is not known, or a bias is out of range.
    """
    mu_left = drive.mu_left_eV
    biases = np.unique(bias_V)
    parts = []
    for first in range(0, biases.size, CHUNK):
        drive.watch()
        chunk = biases[first : first + CHUNK]
        family = family_of(drive.profiles(chunk))
        mu = np.full(chunk.size, mu_left)
        found = tsu_esaki(
            family,
            mu,
            mu - chunk,
            drive.temperature_K,
            drive.structure.left.mass,
            dephasing=drive.dephasing,
        )
        parts.append((chunk, found))
    return joined_curves([_curve(*part) for part in parts])


def slopes_at(drive: Drive, curve: Curve) -> FloatArray:
    """Slope dJ/dV at each bias of a curve from currents computed close to it, shape (B,).

    At the ends of the curve the difference is one-sided.
    """
    bias = curve.bias_V
    if bias.size < 2:
        return np.full(bias.size, np.nan)
    gap = np.diff(bias)
    nearest = np.minimum(np.append(gap, np.inf), np.append(np.inf, gap))
    close = np.maximum(np.minimum(CLOSE_V, 0.5 * nearest), CLOSEST_V)
    low, high = np.maximum(bias - close, bias[0]), np.minimum(bias + close, bias[-1])
    near = curve_at(drive, np.concatenate([low, high]))
    first, last = (
        near.current_density_A_per_cm2[np.searchsorted(near.bias_V, ends)] for ends in (low, high)
    )
    slope: FloatArray = (last - first) / (high - low)
    return slope


def even_biases(from_V: float, to_V: float, points: int) -> FloatArray:
    """Evenly spaced biases, both ends included, without the tails of binary fractions."""
    return np.round(np.linspace(from_V, to_V, points), DECIMALS)


def own_curve(
    drive: Drive, from_V: float, to_V: float, tell: Callable[[Curve], None] | None = None
) -> Curve:
    """Compute the current on biases that follow its features.

    Parameters
    ----------
    from_V, to_V : float
        Ends of the range, both included.
    tell : callable, optional
        Called with what there is after each round.
    """
    kT = BOLTZMANN_EV_PER_K * drive.temperature_K
    about_zero = np.round(kT * np.concatenate([-np.array(ABOUT_ZERO_KT), ABOUT_ZERO_KT]), DECIMALS)
    seeds = about_zero[(about_zero > from_V) & (about_zero < to_V)]
    curve = curve_at(drive, np.append(even_biases(from_V, to_V, FIRST_POINTS), seeds))
    for _ in range(HALVINGS):
        if tell is not None:
            tell(curve)
        middle = _bent_steps(curve)
        if middle.size == 0 or curve.bias_V.size + middle.size > MOST_POINTS:
            break
        curve = joined_curves([curve, curve_at(drive, middle)])
    return curve


def joined_curves(curves: Sequence[Curve]) -> Curve:
    """Put curves of different biases into one."""
    bias = np.concatenate([curve.bias_V for curve in curves])
    _, order = np.unique(bias, return_index=True)
    ranks = max(curve.level_eV.shape[1] for curve in curves)
    columns = {}
    for field in fields(Curve):
        values = [getattr(curve, field.name) for curve in curves]
        if values[0].ndim == 2:
            values = [_filled_up(value, ranks) for value in values]
        columns[field.name] = np.concatenate(values)[order]
    return Curve(**columns)


def slopes(x: FloatArray, y: FloatArray) -> FloatArray:
    """Slope at each point of the polynomial through the points nearest to it, shape (N,)."""
    size = min(STENCIL, x.size)
    if size < 2:
        return np.full(x.size, np.nan)
    start = np.clip(np.arange(x.size) - size // 2, 0, x.size - size)
    index = start[:, None] + np.arange(size)  # (N, size)
    at = np.arange(x.size) - start
    nodes, values = x[index], y[index]
    apart = nodes[:, :, None] - nodes[:, None, :] + np.eye(size)
    weight = 1.0 / np.prod(apart, axis=2)  # barycentric
    here = np.arange(x.size)
    distance = x[:, None] - nodes
    distance[here, at] = 1.0
    ratio = weight / weight[here, at][:, None] / distance
    ratio[here, at] = 0.0
    slope: FloatArray = np.sum(ratio * (values - y[:, None]), axis=1)
    return slope


def _curve(bias_V: FloatArray, currents: Currents) -> Curve:
    return Curve(
        bias_V,
        currents.current_density_A_per_cm2,
        currents.error_A_per_cm2,
        currents.reached,
        np.where(currents.levels.is_level, currents.levels.energy_eV, np.nan),
        np.where(currents.levels.is_level, currents.levels.width_eV, np.nan),
        np.where(currents.levels.is_level, currents.by_level_A_per_cm2, np.nan),
    )


def _filled_up(values: FloatArray, ranks: int) -> FloatArray:
    return np.pad(values, ((0, 0), (0, ranks - values.shape[1])), constant_values=np.nan)


def _bent_steps(curve: Curve) -> FloatArray:
    """Middles of the steps at whose ends the current departs from its neighbours' chord."""
    x, y = curve.bias_V, curve.current_density_A_per_cm2
    if x.size < 3:
        return np.empty(0)
    share = (x[1:-1] - x[:-2]) / (x[2:] - x[:-2])
    chord = y[:-2] * (1.0 - share) + y[2:] * share
    # The largest current at the end of the range must not hide a peak: half weighs the middle.
    size = np.maximum(np.median(np.abs(y)), 0.25 * np.abs(y[1:-1]))
    around = np.max(np.abs([y[:-2], y[1:-1], y[2:]]), axis=0)
    departs = np.abs(y[1:-1] - chord) > np.minimum(4.0 * STRAIGHT * size, FAINT * around)
    bent = np.zeros(x.size - 1, dtype=bool)
    bent[:-1] |= departs
    bent[1:] |= departs
    bent &= np.diff(x) > 1e-5
    return np.round(0.5 * (x[:-1] + x[1:])[bent], DECIMALS)
