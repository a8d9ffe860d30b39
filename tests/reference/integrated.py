"""The outgoing-wave condition by a general integrator of differential equations (scipy).

Independent of ``physics``: psi' = (m/c) f, f' = (V - E) psi is handed to ``solve_ivp`` as it
stands, for many complex energies at once. Good to about eight digits, which is what counting needs.
"""

from __future__ import annotations

import numpy as np
import scipy.integrate
from numpy.typing import NDArray

from reference.many_digits import Slab, Stack, constant

C = float(constant())


def only_leaves(stack: Stack, energy: NDArray[np.complex128]) -> NDArray[np.complex128]:
    """Evaluate what vanishes at the poles; all energies on the sheet of their mean."""
    ratio = []
    for edge, edge_mass, *gap in (stack.left, stack.right):
        mass = edge_mass * (1 + (energy - float(edge)) / gap[0]) if gap else float(edge_mass)
        above = (energy - float(edge)) * C / mass
        is_open = energy.real.mean() > float(edge)
        ratio.append(1j * np.sqrt(above) if is_open else -np.sqrt(-above))
    wave = np.concatenate([np.ones_like(energy), -ratio[0]])
    for slab in stack.slabs:
        wave = _through(slab, wave, energy)
        wave = wave / np.tile(np.abs(wave[: energy.size]) + np.abs(wave[energy.size :]), 2)
    return wave[energy.size :] - ratio[1] * wave[: energy.size]


def _through(
    slab: Slab, wave: NDArray[np.complex128], energy: NDArray[np.complex128]
) -> NDArray[np.complex128]:
    d, v, m = float(slab.thickness), float(slab.edge), float(slab.mass)
    to_v = v if slab.to_edge is None else float(slab.to_edge)
    to_m = m if slab.to_mass is None else float(slab.to_mass)

    first, last = (float(value) for value in slab.mass_slopes())

    def slope(x: float, y: NDArray[np.complex128]) -> NDArray[np.complex128]:
        psi, flux = y[: energy.size], y[energy.size :]
        edge = v + (to_v - v) * x / d
        mass = m + (to_m - m) * x / d + (first + (last - first) * x / d) * (energy - edge)
        return np.concatenate([mass / C * flux, (edge - energy) * psi])

    result = scipy.integrate.solve_ivp(
        slope, (0.0, d), wave, method="DOP853", rtol=1e-9, atol=1e-11, t_eval=[d]
    )
    return result.y[:, -1]


def count_poles(stack: Stack, low: float, high: float, max_width: float) -> int:
    """Count the poles of a window between two contact edges by the winding round it.

    The path is sampled evenly; a step that turns the phase by more than a radian says that there
    are too few points.
    """
    points = 300
    bottom, top = -0.5 * max_width, 0.1
    corners = [complex(*z) for z in ((low, bottom), (high, bottom), (high, top), (low, top))]
    share = np.arange(points) / points
    path = np.concatenate(
        [corners[n] * (1.0 - share) + corners[(n + 1) % 4] * share for n in range(4)]
    )
    values = only_leaves(stack, path)
    turns = np.angle(np.append(values[1:], values[0]) / values)
    assert np.abs(turns).max() < 1.0
    return round(turns.sum() / (2.0 * np.pi))
