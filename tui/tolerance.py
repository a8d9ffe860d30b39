"""What growth errors do to a session's results: a frozen request in, a frozen answer out.

A linear estimate comes at once through ``tell``. Then every draw is computed in full, and again
with each source of error switched off, from the same points: what the yield gains is what the
source costs. Draws go in pieces of one size, so that numbers do not depend on who computes them.
"""

from __future__ import annotations

import math
import time
from collections.abc import Callable
from contextlib import closing
from dataclasses import dataclass, replace
from functools import partial

import numpy as np
from numpy.typing import NDArray

from physics.field import go_on
from tui.chance import Plan, Slopes, plan_of
from tui.crew import cores, shared_out
from tui.draws import Drawn, evaluate_draws, linear_model
from tui.estimate import Linear, bounds, linear_estimate, of_source, sources_of
from tui.session.model import Session
from tui.yields import (
    SCRAMBLINGS,
    Spread,
    Yield,
    all_pass,
    gain_of,
    normal_draws,
    passes,
    spread_of,
    yield_of,
)

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

PIECE, CURVE_PIECE = 128, 8
"""Draws that are computed at once: of levels, side by side; of currents, each by itself."""
ALONE_S = 4.0
"""Work that takes longer is shared out to processes, which take a second to start."""


@dataclass(frozen=True)
class ToleranceRequest:
    """What is asked. None: as the session says."""

    session: Session
    draws: int | None = None
    seed: int | None = None
    jobs: int | None = None
    """Number of processes; None: one a core. The numbers do not depend on it."""


@dataclass(frozen=True)
class Cost:
    """What a source of error costs: the results with it alone switched off."""

    source: str
    variables: tuple[str, ...]
    sd: tuple[float, ...]
    """Of each result without it."""
    without: Yield | None
    """The joint yield without it; None where nothing is specified."""
    gain: float
    """What the joint yield gains; nan where nothing is specified."""
    gain_low: float
    gain_high: float


@dataclass(frozen=True, eq=False)
class Tolerance:
    """The answer, or as much of it as there is."""

    request: ToleranceRequest
    plan: Plan
    linear: Linear
    draws: int
    """Draws that were computed."""
    seed: int
    inputs: FloatArray
    """Standard normal values of the draws, shape (draws, K)."""
    values: FloatArray
    """Results of the draws, shape (draws, M)."""
    spreads: tuple[Spread, ...] = ()
    yields: tuple[Yield | None, ...] = ()
    joint: Yield | None = None
    costs: tuple[Cost, ...] = ()
    """The dearest first; only sources whose draws were all computed."""
    missed: int = 0
    """Draws in which an accuracy was missed, or a level not known again."""
    interrupted: bool = False

    @property
    def reached(self) -> bool:
        """Whether every draw reached its accuracy."""
        return self.missed == 0


@dataclass(frozen=True, eq=False)
class _Piece:
    """Some draws, for a process that knows no more."""

    session: Session
    levels: Slopes | None
    draws: FloatArray


def tolerance(
    request: ToleranceRequest,
    watch: Callable[[], None] = go_on,
    tell: Callable[[Tolerance], None] | None = None,
    progress: Callable[[int, int, float], None] | None = None,
) -> Tolerance:
    """Answer a request.

    Parameters
    ----------
    watch : callable
        Called again and again; by raising it ends the work. An interrupt (KeyboardInterrupt) ends
        it with the answer of what was computed, as soon as there is one.
    tell : callable, optional
        Called with the linear estimate.
    progress : callable, optional
        Called with the draws done, all draws, and the seconds that are left.

    Raises
    ------
    SessionError, PhysicsError
        The session states no errors, or does not describe something that can be computed.
    """
    plan, stated = plan_of(request.session), request.session.tolerance
    seed = stated.seed if request.seed is None else request.seed
    asked = stated.draws if request.draws is None else request.draws
    inputs = normal_draws(len(plan.errors.variables), _rounded(asked), seed)
    begun = time.perf_counter()
    results, levels = linear_model(plan, watch)
    spent_s = (time.perf_counter() - begun) / (1 + 2 * inputs.shape[1])
    linear = linear_estimate(plan, results, seed)
    nothing = np.empty((0, results.value.size))
    first = Tolerance(request, plan, linear, 0, seed, inputs[:0], nothing)
    if tell is not None:
        tell(first)
    runs = _runs(plan, inputs)
    pieces = [_Piece(request.session, levels, part) for run in runs for part in _cut(plan, run)]
    total = len(runs) * inputs.shape[0]
    jobs = request.jobs or cores()
    jobs = 1 if spent_s * total < ALONE_S else min(jobs, len(pieces))
    done: dict[int, Drawn] = {}
    interrupted = False
    try:
        _work(pieces, jobs, done, watch, partial(_report, progress, total, spent_s / jobs))
    except KeyboardInterrupt:
        interrupted = True
        if not done or min(done) >= len(pieces) // len(runs):
            raise
    return replace(_assembled(first, inputs, len(runs), done), interrupted=interrupted)


def _rounded(draws: int) -> int:
    """Give as many draws to every scrambling."""
    return SCRAMBLINGS * math.ceil(draws / SCRAMBLINGS)


def _work(
    pieces: list[_Piece],
    jobs: int,
    done: dict[int, Drawn],
    watch: Callable[[], None],
    report: Callable[[int, float], None],
) -> None:
    begun, count = time.perf_counter(), 0
    report(0, 0.0)
    with closing(shared_out(_evaluate, pieces, jobs, watch)) as results:
        for index, drawn in results:
            done[index] = drawn
            count += drawn.values.shape[0]
            report(count, time.perf_counter() - begun)


def _report(
    progress: Callable[[int, int, float], None] | None,
    total: int,
    expected_s: float,
    count: int,
    spent_s: float,
) -> None:
    """Say how far the work is; to begin with, by what the linear estimate took."""
    if progress is not None:
        each = spent_s / count if count else expected_s
        progress(count, total, each * (total - count))


def _evaluate(piece: _Piece, watch: Callable[[], None]) -> Drawn:
    return evaluate_draws(plan_of(piece.session), piece.draws, piece.levels, watch)


def _runs(plan: Plan, inputs: FloatArray) -> list[FloatArray]:
    """All draws, and with specifications again with each source switched off."""
    if not plan.session.specs:
        return [inputs]
    return [inputs, *(np.where(of_source(plan, s), 0.0, inputs) for s in sources_of(plan))]


def _cut(plan: Plan, draws: FloatArray) -> list[FloatArray]:
    size = PIECE if plan.sweep is None else CURVE_PIECE
    return [draws[n : n + size] for n in range(0, draws.shape[0], size)]


def _assembled(
    first: Tolerance, inputs: FloatArray, runs: int, done: dict[int, Drawn]
) -> Tolerance:
    """Put together what was computed; a run of all sources may be short, the others not."""
    plan = first.plan
    cut = _cut(plan, inputs)
    there = [n for n in range(len(cut)) if n in done]
    values = np.concatenate([done[n].values for n in there])
    missed = int(sum((~drawn.reached).sum() for drawn in done.values()))
    answer = replace(
        first,
        draws=values.shape[0],
        inputs=np.concatenate([cut[n] for n in there]),
        values=values,
        spreads=tuple(spread_of(column) for column in values.T),
        yields=(None,) * values.shape[1],
        missed=missed,
    )
    if not plan.session.specs:
        return answer
    passed = passes(values, *bounds(plan))
    joint = all_pass(values, *bounds(plan))
    costs = []
    for run, source in zip(range(1, runs), sources_of(plan), strict=True):
        numbers = [run * len(cut) + n for n in range(len(cut))]
        if len(there) == len(cut) and all(n in done for n in numbers):
            off = np.concatenate([done[n].values for n in numbers])
            costs.append(_cost(plan, source, off, joint))
    costs.sort(key=lambda cost: -cost.gain)
    return replace(
        answer,
        yields=tuple(yield_of(column) for column in passed.T),
        joint=yield_of(joint),
        costs=tuple(costs),
    )


def _cost(plan: Plan, source: str, off: FloatArray, joint: BoolArray) -> Cost:
    """Say what a source costs, from the draws (N, M) without it."""
    passed = all_pass(off, *bounds(plan))
    names = tuple(v.name for v in plan.errors.variables if v.source == source)
    sd = tuple(spread_of(column).sd for column in off.T)
    return Cost(source, names, sd, yield_of(passed), *gain_of(passed, joint))
