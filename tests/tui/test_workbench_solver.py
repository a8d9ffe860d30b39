"""The computing thread: the latest request wins, and work that still serves is not thrown away."""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator
from dataclasses import replace

import pytest

from tui.session.demo import demo_text
from tui.session.model import Session
from tui.session.read import read_session
from tui.study import Request, Study, solve
from tui.workbench import solver as solvers
from tui.workbench.solver import Hand, Outcome, Solver, Task

DEMO = read_session(demo_text(), "demo")
LONG_S = 10.0


class Bench:
    """A solver whose first computation waits until it is let go on."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch) -> None:
        self.solved: list[Session] = []
        self.outcomes: list[Outcome] = []
        self.begun, self.go_on, self.changed = (threading.Event() for _ in range(3))
        monkeypatch.setattr(solvers, "solve", self._solve)
        self.solver = Solver(self._take)

    def _solve(self, request: Request, watch: Callable[[], None]) -> Study:
        self.solved.append(request.session)
        self.begun.set()
        assert self.go_on.wait(LONG_S)
        return solve(request, watch)

    def _take(self, outcome: Outcome) -> None:
        self.outcomes.append(outcome)
        self.changed.set()

    def until(self, task: Task) -> Outcome:
        while not self.outcomes or self.outcomes[-1].task is not task:
            assert self.changed.wait(LONG_S)
            self.changed.clear()
        return self.outcomes[-1]


@pytest.fixture
def bench(monkeypatch: pytest.MonkeyPatch) -> Iterator[Bench]:
    made = Bench(monkeypatch)
    yield made
    made.go_on.set()
    made.solver.close()


def test_moving_the_line_does_not_begin_the_computation_anew(bench: Bench) -> None:
    first = Task(Request(DEMO), Hand())
    second = Task(Request(DEMO), Hand(energy_eV=0.1))
    bench.solver.ask(first)
    assert bench.begun.wait(LONG_S)
    bench.solver.ask(second)
    bench.go_on.set()
    outcome = bench.until(second)
    assert outcome.reading is not None
    assert outcome.reading.energy_eV == 0.1
    assert bench.solved == [DEMO]


def test_another_design_breaks_off_the_computation(bench: Bench) -> None:
    biased = replace(DEMO, conditions=replace(DEMO.conditions, bias_V=0.1))
    stale, skipped, latest = (
        Task(Request(session), Hand()) for session in (DEMO, replace(DEMO, title="x"), biased)
    )
    bench.solver.ask(stale)
    assert bench.begun.wait(LONG_S)
    bench.solver.ask(skipped)
    bench.solver.ask(latest)
    bench.go_on.set()
    outcome = bench.until(latest)
    assert outcome.study is not None
    assert outcome.study.profile.contact_edge_eV[1] == pytest.approx(-0.1)
    assert bench.solved == [DEMO, biased]
    assert [outcome.task for outcome in bench.outcomes] == [latest]


def test_why_there_is_no_answer_is_said(bench: Bench) -> None:
    bench.go_on.set()
    task = Task(Request(replace(DEMO, view=replace(DEMO.view, from_eV=1.0, to_eV=0.5))), Hand())
    bench.solver.ask(task)
    outcome = bench.until(task)
    assert outcome.study is None
    assert "window from 1 to 0.5 eV is empty" in outcome.trouble
