"""One computing thread: the latest request wins, stale ones are dropped or broken off.

The thread never touches a widget. It hands a frozen outcome to the function it was given, which
posts it as a message.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import dataclass

from physics.errors import PhysicsError
from tui.reading import Reading, read_energy, read_level
from tui.session.refusal import SessionError
from tui.study import Request, Study, solve


@dataclass(frozen=True)
class Hand:
    """What is in hand: a level by its number, or an energy; neither, the lowest level."""

    number: int | None = None
    energy_eV: float | None = None


@dataclass(frozen=True)
class Task:
    """What to compute."""

    request: Request
    hand: Hand


@dataclass(frozen=True, eq=False)
class Outcome:
    """An answer, or why there is none."""

    task: Task
    study: Study | None
    reading: Reading | None
    trouble: str = ""


class _Stale(Exception):  # noqa: N818  no fault: there is something newer to do
    pass


class Solver:
    """Computes in a thread of its own until it is closed."""

    def __init__(self, deliver: Callable[[Outcome], None]) -> None:
        self._deliver = deliver
        self._wanted: Task | None = None
        self._closed = False
        self._changed = threading.Condition()
        self._study: Study | None = None
        self._thread = threading.Thread(target=self._run, name="winze-solver", daemon=True)
        self._thread.start()

    def ask(self, task: Task) -> None:
        """Ask for a task; whatever was asked before and is not done is dropped."""
        with self._changed:
            self._wanted = task
            self._changed.notify()

    def close(self) -> None:
        """End the thread."""
        with self._changed:
            self._closed = True
            self._changed.notify()

    def _run(self) -> None:
        while True:
            with self._changed:
                self._changed.wait_for(lambda: self._wanted is not None or self._closed)
                task, self._wanted = self._wanted, None
                if self._closed or task is None:
                    return
            try:
                outcome = self._answer(task)
            except _Stale:
                continue
            self._deliver(outcome)

    def _watch(self) -> None:
        # Read without the lock: a stale value only costs one more block of work.
        if self._closed or self._wanted is not None:
            raise _Stale

    def _answer(self, task: Task) -> Outcome:
        try:
            if self._study is None or self._study.scene.request != task.request:
                self._study = None
                self._study = solve(task.request, self._watch)
            return Outcome(task, self._study, take(self._study, task.hand))
        except (SessionError, PhysicsError) as error:
            return Outcome(task, None, None, str(error))
        except MemoryError:
            return Outcome(task, None, None, "there is not enough memory for this design")


def take(study: Study, hand: Hand) -> Reading:
    """Read off what is in hand; a level that is no longer there gives way to the nearest number."""
    count = len(study.levels.levels)
    if hand.energy_eV is not None:
        return read_energy(study, hand.energy_eV)
    if count:
        return read_level(study, min(max(hand.number or 1, 1), count))
    return read_energy(study, 0.5 * (study.scene.from_eV + study.scene.to_eV))
