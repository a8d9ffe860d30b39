"""Computing beside the keys: the latest request wins, stale ones are dropped or broken off.

What takes a few milliseconds is computed at once, where a thread would only add the cost of
switching to it and back. Anything else goes to one thread, which never touches a widget: it hands
a frozen outcome to the function it was given, which posts it as a message.
"""

from __future__ import annotations

import threading
import time
from collections.abc import Callable
from dataclasses import dataclass, replace

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


AT_ONCE_S = 0.04
"""Longest time that a key may wait for an answer computed at once."""


class _Stale(Exception):  # noqa: N818  no fault: there is something newer to do
    pass


class Solver:
    """Computes in a thread of its own until it is closed."""

    def __init__(self, deliver: Callable[[Outcome], None]) -> None:
        self._deliver = deliver
        self._wanted: Task | None = None
        self._doing: Task | None = None
        self._closed = False
        self._changed = threading.Condition()
        self._study: Study | None = None
        self._busy = False
        self._is_quick = False
        self._thread = threading.Thread(target=self._run, name="winze-solver", daemon=True)
        self._thread.start()

    def ask(self, task: Task) -> None:
        """Ask for a task; whatever was asked before and is not done is dropped."""
        with self._changed:
            self._wanted = task
            self._changed.notify()

    def answer_at_once(self, task: Task) -> Outcome | None:
        """Answer here and now if that is likely to be quick; None where the thread has to do it."""
        with self._changed:
            if self._busy or self._wanted is not None or not self._is_quick:
                return None
        limit = time.monotonic() + AT_ONCE_S

        def watch() -> None:
            if time.monotonic() > limit:
                raise _Stale

        try:
            return self._answer(task, watch)
        except _Stale:
            self._is_quick = False
            return None

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
                self._busy, self._doing = True, task
            begun = time.monotonic()
            try:
                outcome = self._answer(task, self._watch)
            except _Stale:
                continue
            finally:
                self._busy = False
            self._is_quick = time.monotonic() - begun < AT_ONCE_S
            self._deliver(outcome)

    def _watch(self) -> None:
        # Read without the lock: a stale value only costs one more block of work.
        wanted, doing = self._wanted, self._doing
        is_other = wanted is not None and doing is not None and not _same_design(wanted, doing)
        if self._closed or is_other:
            raise _Stale

    def _answer(self, task: Task, watch: Callable[[], None]) -> Outcome:
        try:
            if self._study is None or self._study.scene.request != task.request:
                self._study = None
                self._study = solve(task.request, watch)
            study = watched(self._study, watch)
            return Outcome(task, self._study, take(study, task.hand))
        except (SessionError, PhysicsError) as error:
            return Outcome(task, None, None, str(error))
        except MemoryError:
            return Outcome(task, None, None, "there is not enough memory for this design")


def _same_design(one: Task, other: Task) -> bool:
    """Whether two tasks only differ in what is in hand, so that one's study serves the other."""
    return one.request.session is other.request.session


def watched(study: Study, watch: Callable[[], None]) -> Study:
    """Let somebody else watch what is computed on a study from now on."""
    profile = replace(study.profile, watch=watch)
    return replace(study, scene=replace(study.scene, profile=profile))


def take(study: Study, hand: Hand) -> Reading:
    """Read off what is in hand; a level that is no longer there gives way to the nearest number."""
    count = len(study.levels.levels)
    if hand.energy_eV is not None:
        return read_energy(study, hand.energy_eV)
    if count:
        return read_level(study, min(max(hand.number or 1, 1), count))
    return read_energy(study, 0.5 * (study.scene.from_eV + study.scene.to_eV))
