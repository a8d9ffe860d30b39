"""Standard error and exit status. Nothing else writes there or decides it.

| status | meaning |
| --- | --- |
| 0 | done |
| 1 | a check, comparison or expectation failed |
| 2 | the input or the call is wrong |
| 3 | a computation could not reach its stated accuracy |
| 130 | interrupted |
"""

from __future__ import annotations

import contextlib
import os
import sys
from collections.abc import Callable

from physics.errors import ConvergenceError, PhysicsError
from tui.session.refusal import SessionError, printable

DONE, FAILED, WRONG, INACCURATE, INTERRUPTED = 0, 1, 2, 3, 130


class CallError(Exception):
    """A command that was called in a way that cannot be answered."""


def say(message: str) -> None:
    """Tell the user something that is not a result."""
    if sys.stderr is None:  # closed by the caller; print would take standard output instead
        return
    with contextlib.suppress(OSError):  # nobody listens: no reason to lose the result
        print(f"winze: {printable(message)}", file=sys.stderr)  # noqa: T201


def guarded(call: Callable[[], int]) -> int:
    """Run a command; turn what goes wrong into a line on standard error and a status."""
    try:
        status = call()
        if sys.stdout is not None:
            sys.stdout.flush()
    except BrokenPipeError:
        status = _reader_left()
    except (SessionError, CallError, PhysicsError, OSError, MemoryError) as error:
        say(_words(error))
        status = INACCURATE if isinstance(error, ConvergenceError) else WRONG
    except KeyboardInterrupt:
        say("interrupted")
        status = INTERRUPTED
    return status


def _words(error: Exception) -> str:
    if isinstance(error, MemoryError):
        return "there is not enough memory; ask for fewer points or a narrower window"
    if isinstance(error, OSError):  # standard output itself: a full disk behind a redirection, say
        return f"the result cannot be written: {error.strerror or error}"
    return str(error)


def _reader_left() -> int:
    """Whoever read the output has enough: no message, and none from the interpreter's exit."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    return DONE
