"""Time the engine against a textbook method in the same run, and print the ratios.

Run it from the top of a checkout::

    python tests/benchmarks/engine.py

The textbook method is a sliced transfer matrix: the tilted edge as a staircase of flat slices, one
2 x 2 product a slice, vectorised over energy in NumPy. Its number of slices is raised until its
error meets that of the comparison, 3e-7.
"""

from __future__ import annotations

import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

TOP = Path(__file__).resolve().parents[2]
sys.path[:0] = [str(TOP), str(TOP / "tests")]


from physics.constants import HBAR2_OVER_2M0_EV_NM2 as C  # noqa: E402
from physics.field import Profile, uniform_field  # noqa: E402
from physics.levels import find_levels  # noqa: E402
from physics.scattering import scatter  # noqa: E402
from physics.spectrum import adaptive_spectrum  # noqa: E402
from reference.stacks import stack, two_barriers  # noqa: E402

EQUAL_ERROR = 3e-7
SLICES = (60, 120, 240, 480, 960, 1920)


def sliced(profile: Profile, energy: NDArray[np.float64], slices: int) -> NDArray[np.float64]:
    """T by products of flat slices' matrices for (psi, psi'/m)."""
    faces = np.unique(
        np.concatenate([np.linspace(0.0, profile.length_nm, slices + 1), profile.position_nm])
    )
    middle, width = 0.5 * (faces[1:] + faces[:-1]), np.diff(faces)
    edge = profile.edge_eV(middle)
    mass = profile.mass_left[np.searchsorted(profile.position_nm, middle) - 1]
    total = np.broadcast_to(np.eye(2, dtype=complex), (energy.size, 2, 2))
    for v, m, h in zip(edge, mass, width, strict=True):
        k = np.sqrt(m * (energy - v + 0j) / C)
        cosine, sine = np.cos(k * h), np.sin(k * h)
        rows = [[cosine, m / k * sine], [-k / m * sine, cosine]]
        total = np.moveaxis(np.array(rows), -1, 0) @ total
    (v0, v1), (m0, m1) = profile.contact_edge_eV, profile.contact_mass
    q0, q1 = np.sqrt(m0 * (energy - v0) / C) / m0, np.sqrt(m1 * (energy - v1) / C) / m1
    a, b, c, d = total[:, 0, 0], total[:, 0, 1], total[:, 1, 0], total[:, 1, 1]
    return 4.0 * q0 * q1 / np.abs(q1 * a + q0 * d - 1j * (q0 * q1 * b - c)) ** 2


def best(call: Callable[[], object], repeat: int = 7) -> float:
    """Shortest of several runs, in seconds."""
    times = []
    for _ in range(repeat):
        start = time.perf_counter()
        call()
        times.append(time.perf_counter() - start)
    return min(times)


def against_the_textbook() -> None:
    profile = uniform_field(two_barriers(), 0.1)
    energy = np.linspace(1e-3, 0.3, 2000)
    exact = scatter(profile, energy).transmission
    ours = best(lambda: scatter(profile, energy))
    print(f"2,000 energies, biased two-barrier stack: {1e3 * ours:.2f} ms")
    for slices in SLICES:
        error = float(np.max(np.abs(sliced(profile, energy, slices) / exact - 1.0)))
        theirs = best(lambda n=slices: sliced(profile, energy, n), 3)
        print(
            f"  {slices:5d} slices: {1e3 * theirs:7.1f} ms, off by {error:.1e}, "
            f"ratio {theirs / ours:.0f}"
        )
        if error <= EQUAL_ERROR:
            break


def levels_with_proof() -> None:
    for name, structure, bias in (
        ("two barriers, biased", two_barriers(), 0.1),
        ("two barriers, 5 nm", two_barriers(5.0, 5.0, 5.0), 0.1),
        ("ten periods", stack([(2.0, 0.3, 0.092), (5.0, 0.0, 0.067)] * 10), 0.1),
    ):
        profile = uniform_field(structure, bias)
        low, high = profile.lowest_eV, profile.highest_eV
        taken = best(lambda p=profile, a=low, b=high: find_levels(p, a, b))
        found = find_levels(profile, low, high)
        drawn = best(lambda p=profile, a=low, b=high, f=found: adaptive_spectrum(p, a, b, f))
        points = adaptive_spectrum(profile, low, high, found).energy_eV.size
        print(
            f"{name}: {len(found.levels)} levels in {1e3 * taken:.1f} ms, "
            f"proved {found.complete}; spectrum of {points} points in {1e3 * drawn:.1f} ms"
        )


def linear_cost() -> None:
    base = 0.0
    for periods in (125, 250, 500):
        profile = uniform_field(stack([(5.0, 0.0, 0.067), (2.0, 0.3, 0.092)] * periods), 0.1)
        for energies in (500, 1000, 2000):
            energy = np.linspace(1e-3, 0.3, energies)
            taken = best(lambda p=profile, e=energy: scatter(p, e), 3)
            base = base or taken / (periods * energies)
            print(
                f"{2 * periods:5d} layers, {energies:5d} energies: {1e3 * taken:7.1f} ms, "
                f"per layer and energy {taken / (periods * energies) / base:.2f} of the first"
            )


def whole_process() -> None:
    text = subprocess.run(
        [sys.executable, "-m", "tui.command.entry", "example"],
        cwd=TOP,
        capture_output=True,
        check=True,
    ).stdout
    command = [sys.executable, "-m", "tui.command.entry", "levels", "-"]

    def run() -> None:
        subprocess.run(command, cwd=TOP, input=text, capture_output=True, check=True)

    run()
    print(f"`winze levels FILE` as a whole process: {best(run):.2f} s")


if __name__ == "__main__":
    against_the_textbook()
    levels_with_proof()
    linear_cost()
    whole_process()
