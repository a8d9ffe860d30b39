"""What a session leaves to chance, and which of its results are looked at."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache, partial

import numpy as np
from numpy.typing import NDArray

from physics.alloy_errors import Makeup
from physics.drawn_levels import Expected, expected_of
from physics.errors import StructureError
from physics.growth_errors import Deviations, GrowthErrors, growth_errors
from physics.levels import LevelSet, find_levels
from physics.materials import Material
from physics.structure import Structure
from tui.outcome import Outcome, outcome
from tui.session.growth import grown, substrate_of
from tui.session.lines import KeyPath
from tui.session.model import Session, ToleranceEntry
from tui.session.refusal import SessionError
from tui.session.resolve import resolve
from tui.study import Request, set_scene
from tui.sweep import SweepRequest, range_of

FloatArray = NDArray[np.float64]

QUICK_KEYS = ("energy_eV", "width_eV", "log10_width_eV", "lifetime_s")
"""What is known of levels that are computed side by side."""
SWEEP_POINTS = 31
"""Biases of a draw's current curve; peak and valley are sought between them."""


@dataclass(frozen=True, eq=False)
class Plan:
    """What is drawn and what is looked at."""

    session: Session
    outcomes: tuple[Outcome, ...]
    errors: GrowthErrors
    expected: Expected | None
    """The levels that are looked at and their neighbours; None where none is."""
    numbers: tuple[int, ...]
    """Of these levels in the session's window, counted from 1."""
    sweep: SweepRequest | None
    """The current curve's range, the same for all draws; None where no current is looked at."""


@dataclass(frozen=True, eq=False)
class Slopes:
    """A linear model of M values: their derivatives by K variables, in standard deviations."""

    value: FloatArray
    """As designed, shape (M,)."""
    slope: FloatArray
    """Shape (M, K); 0 for a grading."""
    bend: FloatArray
    """What the square of a grading's variable brings, shape (M, K); 0 for others: a grade acts by
    the square of its width."""

    def at(self, draws: FloatArray) -> FloatArray:
        """Predict the values of draws (N, K), shape (N, M)."""
        predicted: FloatArray = self.value + draws @ self.slope.T + draws**2 @ self.bend.T
        return predicted


def plan_of(session: Session) -> Plan:
    """Say what is drawn and looked at; without specifications, energies and widths of all levels.

    Raises
    ------
    SessionError, PhysicsError
        No error is stated, a result is not known, or the session cannot be computed.
    """
    return _plan_of(session)


@lru_cache(maxsize=2)
def _plan_of(session: Session) -> Plan:
    structure = resolve(session)
    errors = _errors_of(session, structure)
    paths: list[KeyPath] = [("spec", n, "result") for n in range(len(session.specs))]
    wanted = [outcome(spec.result, path) for spec, path in zip(session.specs, paths, strict=True)]
    sweep = None
    if any(one.needs_curve for one in wanted):
        low, high = range_of(SweepRequest(session), structure)
        sweep = SweepRequest(session, low, high, SWEEP_POINTS)
    if wanted and not any(one.of == "level" for one in wanted):
        return Plan(session, tuple(wanted), errors, None, (), sweep)
    scene = set_scene(Request(session))
    design = find_levels(scene.profile, scene.from_eV, scene.to_eV, scene.max_width_eV)
    count = len(design.levels)
    if not wanted:
        keys = QUICK_KEYS[:2]
        wanted = [
            Outcome(f"level {n + 1} {key}", "level", n + 1, key)
            for n in range(count)
            for key in keys
        ]
    for one, path in zip(wanted, paths, strict=False):
        if one.number > count:
            found = f"is {one.text!r}, but the design has {count} levels in its window"
            allowed = "name another level, or widen the window in [view]"
            raise SessionError("result", found, allowed, path=path)
    return Plan(session, tuple(wanted), errors, *_near(design, wanted), sweep)


def _near(design: LevelSet, wanted: Sequence[Outcome]) -> tuple[Expected | None, tuple[int, ...]]:
    """Take the wanted levels and their neighbours, from whom they have to be told apart."""
    asked = {one.number for one in wanted if one.number}
    if not asked:
        return None, ()
    near = {n + by for n in asked for by in (-1, 0, 1)}
    numbers = [n for n in sorted(near) if 1 <= n <= len(design.levels)]
    kept = replace(design, levels=tuple(design.levels[n - 1] for n in numbers))
    return expected_of(kept, [numbers.index(n) for n in sorted(asked)]), tuple(numbers)


def _errors_of(session: Session, structure: Structure) -> GrowthErrors:
    stated, temperature = session.tolerance, session.conditions.temperature_K
    own = {entry.name for entry in session.materials}

    def formula(name: str | None) -> str | None:
        return None if name in own else name

    makeup = Makeup(
        formula(session.left.material),
        tuple((formula(layer.material), formula(layer.to_material)) for layer in session.layers),
        formula(session.right.material),
        partial(_grown, temperature_K=temperature, substrate=substrate_of(session)),
    )
    try:
        errors = growth_errors(structure, _deviations(stated), makeup, temperature)
    except StructureError as error:
        found = f"has no monolayer to count in at {error.where}"
        path: KeyPath = ("tolerance", "thickness_ml")
        raise SessionError("tolerance thickness_ml", found, error.allowed, path=path) from error
    if not errors.variables:
        allowed = (
            "under [tolerance] give one of rate_percent, thickness_nm, thickness_ml, composition, "
            "donors_percent and grading_nm that acts on this design"
        )
        raise SessionError("tolerance", "leaves nothing to chance", allowed, path=("tolerance",))
    return errors


def _deviations(stated: ToleranceEntry) -> Deviations:
    return Deviations(
        rate=0.01 * (stated.rate_percent or 0.0),
        thickness_nm=stated.thickness_nm or 0.0,
        thickness_ml=stated.thickness_ml or 0.0,
        composition=stated.composition or 0.0,
        donors=0.01 * (stated.donors_percent or 0.0),
        grading_nm=stated.grading_nm or 0.0,
    )


def _grown(name: str, *, temperature_K: float, substrate: str | None) -> Material:
    return grown(name, temperature_K, substrate, ("tolerance", "composition"))
