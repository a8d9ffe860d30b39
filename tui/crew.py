"""Work shared out to processes: the same pieces in the same way, however many do them.

Processes are started afresh (spawn), so that nothing of the parent's state goes along. An interrupt
comes to the parent alone, which tells the others to end through `watch`.
"""

from __future__ import annotations

import os
import signal
from collections.abc import Callable, Generator, Iterator, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any, TypeVar

from physics.field import go_on
from tui.diagnostics import CallError

if TYPE_CHECKING:
    from concurrent.futures import Future

Piece = TypeVar("Piece")
Done = TypeVar("Done")

LOOK_EVERY_S = 0.2
"""How often the parent looks whether it has been told to end."""
_told: list[Any] = []
"""In a worker: the event that ends it."""


class EndedError(Exception):
    """A worker was told to end."""


def cores() -> int:
    """Count the cores that this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def shared_out(
    work: Callable[[Piece, Callable[[], None]], Done],
    pieces: Sequence[Piece],
    jobs: int,
    watch: Callable[[], None] = go_on,
) -> Generator[tuple[int, Done], None, None]:
    """Do pieces of work; yield each result with its piece's index, as they are done.

    Parameters
    ----------
    work : callable
        Takes a piece and a ``watch``; both it and the pieces go to other processes by pickle.
    jobs : int
        Number of processes; 1: all is done in this one.
    watch : callable
        Called again and again; by raising it ends the work, here and in every process.

    Raises
    ------
    CallError
        A process has died.
    """
    if jobs <= 1:
        for index, piece in enumerate(pieces):
            yield index, work(piece, watch)
        return
    from concurrent.futures import ProcessPoolExecutor
    from concurrent.futures.process import BrokenProcessPool
    from multiprocessing import get_context

    context = get_context("spawn")
    end = context.Event()
    executor = ProcessPoolExecutor(jobs, context, _begin, (end,))
    try:
        with _interrupts_held():  # what is held back here is so in the processes started here
            futures = {executor.submit(_do, work, piece): n for n, piece in enumerate(pieces)}
        yield from _finished(futures, watch)
    except BrokenProcessPool as error:
        raise CallError("a process of the work has died; --jobs 1 does without them") from error
    finally:
        end.set()
        executor.shutdown(cancel_futures=True)


def _finished(
    futures: dict[Future[Done], int], watch: Callable[[], None]
) -> Iterator[tuple[int, Done]]:
    from concurrent.futures import FIRST_COMPLETED, wait

    waiting = set(futures)
    while waiting:
        watch()
        done, waiting = wait(waiting, LOOK_EVERY_S, FIRST_COMPLETED)
        for future in done:
            yield futures[future], future.result()


def _begin(end: Any) -> None:
    """Make a worker deaf to interrupts, and ready to be told to end."""
    from threading import Thread

    signal.signal(signal.SIGINT, signal.SIG_IGN)
    _told[:] = [end]
    Thread(target=_end_with_parent, daemon=True).start()


def _end_with_parent() -> None:
    """Leave when the parent is gone, however it went; a queue alone would not tell."""
    from multiprocessing import parent_process

    parent = parent_process()
    if parent is not None:
        parent.join()
        os._exit(1)


def _do(work: Callable[[Piece, Callable[[], None]], Done], piece: Piece) -> Done:
    return work(piece, _watch)


def _watch() -> None:
    if _told and _told[0].is_set():
        raise EndedError


@contextmanager
def _interrupts_held() -> Iterator[None]:
    if not hasattr(signal, "pthread_sigmask"):
        yield
        return
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)
