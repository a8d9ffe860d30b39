"""The current curve against a plain script, in one run.

    python tests/benchmarks/current.py

The plain script is what one writes in an afternoon: 20,000 even energies, 240 flat slices, 2 x 2
matrices over all energies at once, the trapezoidal rule. It is run at a few biases and counted up
to 101. Both are held against the same stack's current by winze at a hundredth of its tolerance.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from physics import current as currents
from physics.constants import BOLTZMANN_EV_PER_K, HBAR2_OVER_2M0_EV_NM2
from physics.curve import Drive, curve_at, own_curve
from physics.extremes import regions
from physics.field import uniform_field
from physics.structure import Contact, Layer, Structure

ENERGIES, SLICES, BIASES = 20_000, 240, 101
TRIED = (10, 40, 70)
MASS, BARRIER_MASS, HEIGHT, FERMI, KELVIN = 0.067, 0.092, 0.3, 0.054, 300.0
FloatArray = NDArray[np.float64]


def structure(barrier_nm: float) -> Structure:
    contact = Contact(0.0, MASS, FERMI)
    wall = Layer(barrier_nm, HEIGHT, BARRIER_MASS)
    spacer, well = Layer(5.0, 0.0, MASS), Layer(5.0, 0.0, MASS)
    return Structure(contact, (spacer, wall, well, wall, spacer), contact)


def plain_current(stack: Structure, bias_V: float) -> float:
    """The afternoon's script, vectorised over energy."""
    length = sum(layer.thickness_nm for layer in stack.layers)
    number = [round(SLICES * layer.thickness_nm / length) for layer in stack.layers]
    home = np.repeat(np.arange(len(number)), number)
    steps = np.array([stack.layers[n].thickness_nm / number[n] for n in home])
    middle = np.cumsum(steps) - 0.5 * steps
    edge = np.array([stack.layers[n].edge_eV for n in home]) - bias_V * middle / length
    mass = np.array([stack.layers[n].mass for n in home])
    kT = BOLTZMANN_EV_PER_K * KELVIN
    low = max(0.0, -bias_V)
    energy = np.linspace(low + 1e-6, low + 1.1, ENERGIES)
    c = HBAR2_OVER_2M0_EV_NM2
    a, b = np.ones(ENERGIES, complex), np.zeros(ENERGIES, complex)
    cc, d = np.zeros(ENERGIES, complex), np.ones(ENERGIES, complex)
    for v, m, step in zip(edge, mass, steps, strict=True):
        k = np.sqrt(m * (energy - v) / c + 0j)
        cos, sin = np.cos(k * step), np.sin(k * step)
        p, q = m / k * sin, -k / m * sin
        a, b, cc, d = cos * a + p * cc, cos * b + p * d, q * a + cos * cc, q * b + cos * d
    k0, k1 = (np.sqrt(MASS * (energy - v) / c + 0j) / MASS for v in (0.0, -bias_V))
    t = 2j * k0 / (1j * k0 * d + 1j * k1 * a + k0 * k1 * b - cc)
    through = np.abs(t) ** 2 * (k1 / k0).real
    supply = kT * (
        np.logaddexp(0.0, (FERMI - energy) / kT) - np.logaddexp(0.0, (FERMI - bias_V - energy) / kT)
    )
    return float(currents.current_scale(MASS) * np.trapezoid(through * supply, energy))


def drive(stack: Structure) -> Drive:
    return Drive(
        stack, KELVIN, lambda biases: [uniform_field(stack, bias) for bias in biases.tolist()]
    )


def best_s(call: Callable[[], object], times: int = 3) -> float:
    spent = []
    for _ in range(times):
        start = time.perf_counter()
        call()
        spent.append(time.perf_counter() - start)
    return min(spent)


def compare(stack: Structure) -> str:
    """Run both and say how they did."""
    bias = np.linspace(0.0, 0.5, BIASES)
    tried = bias[list(TRIED)]
    ours_s = best_s(lambda: curve_at(drive(stack), bias))
    ours = curve_at(drive(stack), bias).current_density_A_per_cm2[list(TRIED)]
    start = time.perf_counter()
    plain = np.array([plain_current(stack, float(v)) for v in tried])
    plain_s = (time.perf_counter() - start) * BIASES / len(TRIED)
    currents.RELATIVE_ERROR *= 0.01
    exact = curve_at(drive(stack), tried).current_density_A_per_cm2
    currents.RELATIVE_ERROR *= 100.0
    ours_off, plain_off = (np.abs(found / exact - 1.0).max() for found in (ours, plain))
    own_s = best_s(lambda: regions(drive(stack), own_curve(drive(stack), 0.0, 0.5)), 1)
    return (
        f"101 biases {ours_s:.3f} s, off by {ours_off:.0e}; plain script {plain_s:.0f} s, off by "
        f"{plain_off:.0e}: {plain_s / ours_s:.0f} times; own grid with features {own_s:.2f} s"
    )


def main() -> None:
    """Compare at three thicknesses of the barriers."""
    for barrier_nm in (2.83, 5.66, 11.0):
        print(f"barriers {barrier_nm:5.2f} nm: {compare(structure(barrier_nm))}")


if __name__ == "__main__":
    main()
