"""The command ``winze``: so light that an interrupt is answered from the first moment on."""

from __future__ import annotations

import os
import signal
import sys
from collections.abc import Callable, Sequence

THREADS = ("OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "VECLIB_MAXIMUM_THREADS")
"""Read by numpy's matrix products when it is loaded. Ours are slim: several threads spend their
time waiting for each other, and five times as much where cores are shared."""


def main(argv: Sequence[str] | None = None) -> int:
    """Run winze with the given arguments, or the process's own."""
    release = _hold_interrupts()
    for name in THREADS:
        os.environ.setdefault(name, "1")
    from tui.diagnostics import guarded

    def run() -> int:
        try:
            from tui.command.calls import answer
        finally:
            release()
        return answer(list(sys.argv[1:] if argv is None else argv))

    status = guarded(run)
    if argv is None:  # all is said; an interrupt now would only spoil the interpreter's exit
        signal.signal(signal.SIGINT, signal.SIG_IGN)
    return status


def _hold_interrupts() -> Callable[[], object]:
    """Hold an interrupt back while modules are loaded, where half a second does no harm.

    In the middle of an import it would be lost or end in another error now and then. Gives what
    lets interrupts through again.
    """
    if not hasattr(signal, "pthread_sigmask"):
        return lambda: None
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    return lambda: signal.pthread_sigmask(signal.SIG_SETMASK, before)


if __name__ == "__main__":
    sys.exit(main())
