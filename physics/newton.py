"""Newton's method for Poisson's equation on a mesh.

Each element is a parabola with Simpson's rule for its charge (quadratic finite elements, G. Strang
and G. J. Fix, An Analysis of the Finite Element Method (1973), from memory): the potential at the
faces is right to the fourth power of the step, and the charge balances over the whole domain
exactly. Electrons only grow with the potential, so the equation is that of the minimum of a convex
function: a step that is cut back until the descent along it has not yet turned round leads to the
one solution from any start.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.charge import Electrons
from physics.mesh import Mesh

FloatArray = NDArray[np.float64]

SIMPSON = np.array([1.0, 4.0, 1.0]) / 6.0
STIFFNESS = np.array([[7.0, -8.0, 1.0], [-8.0, 16.0, -8.0], [1.0, -8.0, 7.0]]) / 3.0
"""Integral of the products of the three parabolas' slopes, times the element's length."""
MOST_STEPS = 80
TOLERANCE_V = 1e-9
"""Newton step from which the next one is far below what any level notices."""
MOST_HALVINGS = 40
TURNED = 0.1
"""A step is cut where the descent has turned into an ascent this steep, as a share of it."""


@dataclass(frozen=True, eq=False)
class Relaxed:
    """Where the iteration ended."""

    potential_V: FloatArray
    """At the nodes, shape (2 E + 1,)."""
    converged: bool
    steps: int
    last_step_V: float
    residual: float
    """Largest imbalance of a node over the largest charge of a node."""
    first_residual: float
    """The same where the iteration began."""


def on_elements(node: FloatArray) -> FloatArray:
    """Values at the nodes (2 E + 1,) element by element, (E, 3)."""
    return np.stack([node[:-1:2], node[1::2], node[2::2]], axis=1)


def on_nodes(element: FloatArray) -> FloatArray:
    """Add up what elements (E, 3) give to the nodes (2 E + 1,)."""
    node = np.zeros(2 * element.shape[0] + 1)
    node[:-1:2] = element[:, 0]
    node[1::2] = element[:, 1]
    node[2::2] += element[:, 2]
    return node


def relax(
    mesh: Mesh,
    electrons: Electrons,
    start_V: FloatArray,
    watch: Callable[[], None],
    most_steps: int = MOST_STEPS,
) -> Relaxed:
    """Solve ``(eps phi')' = -(donors - electrons)`` with the potential held at both ends.

    Parameters
    ----------
    mesh : Mesh
        The elements.
    electrons : callable
        The electrons' density over the potential.
    start_V : ndarray, shape (2 E + 1,)
        Where to begin; its ends are held.
    watch : callable
        Called once a step.
    most_steps : int
        Steps after which it is given up.
    """
    balance = _Balance(mesh, electrons)
    potential = start_V.copy()
    force, slope, residual = balance.at(potential)
    first = residual
    last = np.inf
    for number in range(1, most_steps + 1):
        watch()
        step = balance.newton_step(force, slope)
        last = float(np.abs(step).max())
        share, (force, slope, residual) = _descent(balance, potential, step, force)
        potential = potential + share * step
        if share == 1.0 and last <= TOLERANCE_V:
            return Relaxed(potential, True, number, last, residual, first)
    return Relaxed(potential, False, most_steps, last, residual, first)


class _Balance:
    """The imbalance of charge at every inner node and its derivative."""

    def __init__(self, mesh: Mesh, electrons: Electrons) -> None:
        self.electrons = electrons
        self.weight = mesh.step_nm[:, None] * SIMPSON
        self.donors = mesh.donors_nm3[:, None]
        self.strength = (mesh.permittivity / mesh.step_nm)[:, None]
        size = 2 * mesh.permittivity.size + 1
        self.bands = np.zeros((3, size))  # upper form: second, first and main diagonal
        stiff = self.strength[:, :, None] * STIFFNESS
        self.bands[2] = on_nodes(np.stack([stiff[:, n, n] for n in range(3)], axis=1))
        self.bands[1, 1::2], self.bands[1, 2::2] = stiff[:, 0, 1], stiff[:, 1, 2]
        self.bands[0, 2::2] = stiff[:, 0, 2]

    def at(self, potential_V: FloatArray) -> tuple[FloatArray, FloatArray, float]:
        """Imbalance and slope of the charge at the nodes, and the relative residual."""
        element = on_elements(potential_V)
        count, rate = self.electrons(element)
        # Differences first: the potential itself may be a volt where its bending is a microvolt.
        rise = np.stack([element[:, 1] - element[:, 0], element[:, 2] - element[:, 1]], axis=1)
        bent = np.stack(
            [
                -7.0 * rise[:, 0] + rise[:, 1],
                8.0 * (rise[:, 0] - rise[:, 1]),
                7.0 * rise[:, 1] - rise[:, 0],
            ],
            axis=1,
        ) * (self.strength / 3.0)
        force = on_nodes((self.donors - count) * self.weight - bent)
        force[0] = force[-1] = 0.0
        charge = on_nodes(np.maximum(self.donors, count) * self.weight)
        residual = float(np.abs(force).max() / max(float(charge.max()), np.finfo(float).tiny))
        return force, on_nodes(rate * self.weight), residual

    def newton_step(self, force: FloatArray, slope: FloatArray) -> FloatArray:
        """Solve for the step that would balance the charge if all were linear."""
        from scipy.linalg import solveh_banded

        bands = self.bands.copy()
        bands[2] += slope
        step = np.zeros_like(force)
        step[1:-1] = solveh_banded(bands[:, 1:-1], force[1:-1], check_finite=False)
        return step


def _descent(
    balance: _Balance, potential: FloatArray, step: FloatArray, force: FloatArray
) -> tuple[float, tuple[FloatArray, FloatArray, float]]:
    """Cut a step until the descent along it has not turned round; its share and the state there."""
    downhill = float(step @ force)
    share = 1.0
    if np.abs(step).max() <= TOLERANCE_V:  # all that is left to see is rounding
        return share, balance.at(potential + step)
    for _ in range(MOST_HALVINGS):
        state = balance.at(potential + share * step)
        if float(step @ state[0]) >= -TURNED * abs(downhill):
            break
        share *= 0.5
    return share, state
