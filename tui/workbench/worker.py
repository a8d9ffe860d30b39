"""A thread that does one thing at a time: the latest wish wins, what is under way is broken off."""

from __future__ import annotations

import threading
from collections.abc import Callable
from typing import Generic, TypeVar

Wish = TypeVar("Wish")
Watch = Callable[[], None]


class BrokenOff(Exception):  # noqa: N818  no fault: there is something newer to do, or nothing
    """Raised by a watch to end work that nobody waits for."""


class Worker(Generic[Wish]):
    """Does what it was made for, in a thread of its own, until it is closed.

    Parameters
    ----------
    work : callable
        Takes a wish and a watch, which it calls again and again while it works, and hands on what
        it finds by itself.
    """

    def __init__(self, name: str, work: Callable[[Wish, Watch], None]) -> None:
        self._work = work
        self._wanted: Wish | None = None
        self._dropped = False
        self._closed = False
        self._changed = threading.Condition()
        self._thread = threading.Thread(target=self._run, name=name, daemon=True)
        self._thread.start()

    def ask(self, wish: Wish) -> None:
        """Ask for something; whatever was asked before and is not done is dropped."""
        with self._changed:
            self._wanted, self._dropped = wish, True
            self._changed.notify()

    def drop(self) -> None:
        """Break off what is under way, and ask for nothing."""
        with self._changed:
            self._wanted, self._dropped = None, True

    def close(self) -> None:
        """End the thread."""
        with self._changed:
            self._closed = self._dropped = True
            self._changed.notify()

    def _run(self) -> None:
        while True:
            with self._changed:
                self._changed.wait_for(lambda: self._wanted is not None or self._closed)
                wish, self._wanted, self._dropped = self._wanted, None, self._closed
            if self._closed or wish is None:
                return
            try:
                self._work(wish, self._watch)
            except BrokenOff:
                continue

    def _watch(self) -> None:
        # Read without the lock: a stale value only costs one more block of work.
        if self._dropped:
            raise BrokenOff
