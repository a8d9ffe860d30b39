"""Draws of growth errors per second, on one process and on two.

    python tests/benchmarks/tolerance.py

The demo design with all five sources of error; energy and width of its first level, each draw in
full, and once more with each source switched off.
"""

from __future__ import annotations

import os
import sys
import time
from pathlib import Path

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from tui.session.demo import demo_text
from tui.session.read import read_session
from tui.tolerance import Tolerance, ToleranceRequest, tolerance

DRAWS = 2048
ERRORS = """
[tolerance]
rate_percent = 1.0
thickness_ml = 0.5
composition = 0.005
donors_percent = 5.0
grading_nm = 0.3
"""
SPECS = """
[[spec]]
result = "level 1 energy_eV"
at_least = 0.06
at_most = 0.066

[[spec]]
result = "level 1 width_eV"
at_most = 0.0015
"""


def timed(text: str, jobs: int) -> tuple[float, Tolerance]:
    session = read_session(demo_text() + text, "demo")
    start = time.perf_counter()
    found = tolerance(ToleranceRequest(session, DRAWS, jobs=jobs))
    return time.perf_counter() - start, found


def main() -> None:
    """Print draws per second."""
    timed(ERRORS, 1)  # imports apart
    spent, found = timed(ERRORS, 1)
    print(f"{found.draws} draws, levels 1 and 2, one process: {spent:.2f} s, {DRAWS / spent:.0f}/s")
    runs = 1 + 5
    rates = []
    for jobs in (1, 2):
        spent, found = timed(ERRORS + SPECS, jobs)
        rates.append(runs * DRAWS / spent)
        print(
            f"{found.draws} draws and five times with a source off, {jobs} process"
            f"{'es' if jobs > 1 else ''}: {spent:.2f} s, {rates[-1]:.0f} draws/s"
        )
    print(f"two processes: {rates[1] / rates[0]:.2f} times one")


if __name__ == "__main__":
    main()
