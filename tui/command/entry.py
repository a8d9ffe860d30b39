"""The command ``winze``: so light that an interrupt is answered from the first moment on."""

from __future__ import annotations

import contextlib
import signal
import sys
from collections.abc import Iterator, Sequence

from tui.diagnostics import guarded


def main(argv: Sequence[str] | None = None) -> int:
    """Run winze with the given arguments, or the process's own."""

    def run() -> int:
        with _uninterrupted():
            from tui.command.calls import answer

        return answer(list(sys.argv[1:] if argv is None else argv))

    status = guarded(run)
    if argv is None:  # all is said; an interrupt now would only spoil the interpreter's exit
        signal.signal(signal.SIGINT, signal.SIG_IGN)
    return status


@contextlib.contextmanager
def _uninterrupted() -> Iterator[None]:
    """Hold an interrupt back while modules are loaded, where half a second does no harm.

    In the middle of an import it would be lost or end in another error now and then.
    """
    if not hasattr(signal, "pthread_sigmask"):
        yield
        return
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


if __name__ == "__main__":
    sys.exit(main())
