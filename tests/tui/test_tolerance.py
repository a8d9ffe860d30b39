"""Growth errors: linear problems against normal theory, and what must not depend on what."""

import math
from dataclasses import replace

import numpy as np
import pytest

from tui.chance import plan_of
from tui.draws import evaluate_draws
from tui.session.demo import demo_text
from tui.session.model import Session, SpecEntry, ToleranceEntry
from tui.session.read import read_session
from tui.session.refusal import SessionError
from tui.tolerance import Tolerance, ToleranceRequest, tolerance

DEMO = read_session(demo_text(), "demo")
ENERGY = "level 1 energy_eV"


def errors(session: Session = DEMO, *specs: SpecEntry, **stated: float) -> Session:
    return replace(session, specs=specs, tolerance=ToleranceEntry(**stated))  # type: ignore[arg-type]


def solved(session: Session, draws: int = 256, **more: int) -> Tolerance:
    return tolerance(ToleranceRequest(session, draws, jobs=more.pop("jobs", 1), **more))


def normal_below(z: float) -> float:
    return 0.5 * math.erfc(-z / math.sqrt(2.0))


def test_one_linear_error_against_normal_theory() -> None:
    """A drift of 0.05 % moves the level by so little that it is linear."""
    free = solved(errors(rate_percent=0.05), 1024)
    sd = float(free.linear.sd[0])
    nominal = float(free.linear.slopes.value[0])
    bounds = SpecEntry(ENERGY, nominal - 1.2 * sd, nominal + 0.4 * sd)
    found = solved(errors(DEMO, bounds, rate_percent=0.05), 1024)
    exact = normal_below(0.4) - normal_below(-1.2)
    assert found.spreads[0].mean == pytest.approx(nominal, abs=0.02 * sd)
    assert found.spreads[0].sd == pytest.approx(sd, rel=0.01)
    assert found.spreads[0].p95 == pytest.approx(nominal + 1.6449 * sd, abs=0.03 * sd)
    assert found.joint is not None
    assert found.joint.low <= exact <= found.joint.high
    assert found.joint.value == pytest.approx(exact, abs=0.01)
    assert found.linear.joint == pytest.approx(exact, abs=0.02)


def test_numbers_depend_on_the_seed_and_on_nothing_else(monkeypatch: pytest.MonkeyPatch) -> None:
    session = errors(DEMO, SpecEntry(ENERGY, 0.06, 0.066), rate_percent=1.0, thickness_ml=0.5)
    monkeypatch.setattr("tui.tolerance.ALONE_S", 0.0)
    one, two = solved(session), solved(session, jobs=2)
    assert np.array_equal(one.values, two.values)
    assert one.joint == two.joint
    assert one.costs == two.costs
    other = solved(session, seed=2)
    assert not np.array_equal(one.values, other.values)


def test_what_a_source_does_not_reach_has_no_spread() -> None:
    """In a uniform field without Fermi energies no level knows the donors."""
    left, right = (replace(side, donors_cm3=None) for side in (DEMO.left, DEMO.right))
    layers = (replace(DEMO.layers[0], donors_cm3=1e17), *DEMO.layers[1:])
    bare = replace(DEMO, left=left, right=right, layers=layers)
    found = solved(errors(bare, donors_percent=10.0), 64)
    assert found.plan.errors.variables[0].name == "donors layer 1"
    assert [spread.sd for spread in found.spreads] == pytest.approx([0.0] * 4, abs=1e-13)
    assert found.linear.sd == pytest.approx(0.0, abs=1e-12)


def test_the_dearest_source_comes_first() -> None:
    spec = SpecEntry(ENERGY, 0.061, 0.0637)
    found = solved(errors(DEMO, spec, rate_percent=0.1, thickness_ml=0.5, composition=0.001))
    assert found.costs[0].source == "thickness"
    assert found.costs[0].without is not None
    assert found.costs[0].without.value == 1.0
    assert abs(found.costs[1].gain) < 0.03 < found.costs[0].gain


def test_the_interval_covers_a_long_run() -> None:
    spec = SpecEntry(ENERGY, 0.06, 0.066)
    session = errors(DEMO, spec, rate_percent=1.0, thickness_ml=0.5, composition=0.005)
    plan = plan_of(session)
    random = np.random.default_rng(5).standard_normal((4096, len(plan.errors.variables)))
    values = np.concatenate(
        [evaluate_draws(plan, part, None).values for part in np.array_split(random, 16)]
    )
    long = float(((values >= 0.06) & (values <= 0.066)).mean())
    scatter = 2.0 * math.sqrt(long * (1.0 - long) / 4096)
    for seed in (1, 2, 3):
        joint = solved(session, 256, seed=seed).joint
        assert joint is not None
        assert joint.low - scatter <= long <= joint.high + scatter


def test_a_drift_moves_both_barriers_together() -> None:
    """They stay alike, so the peak transmission of the symmetric stack stays 1."""
    spec = SpecEntry("level 1 peak_transmission", 0.5)
    drift = solved(errors(DEMO, spec, rate_percent=2.0), 64)
    apart = solved(errors(DEMO, spec, thickness_ml=0.5), 64)
    assert drift.values == pytest.approx(1.0, abs=1e-9)
    assert float(apart.values.min()) < 0.99


def test_gradings_act_by_the_square_of_their_width() -> None:
    found = solved(errors(grading_nm=0.2), 256)
    bend = float(found.linear.slopes.bend[0, 0])
    squares = found.inputs[:, 0] ** 2
    assert found.values[:, 0] == pytest.approx(
        found.linear.slopes.value[0] + bend * squares, abs=0.1 * abs(bend) * squares.max()
    )


def test_draws_side_by_side_are_those_with_a_proof(monkeypatch: pytest.MonkeyPatch) -> None:
    session = errors(thickness_ml=1.0, grading_nm=0.3, donors_percent=5.0)
    quick = solved(session, 32)
    nothing = np.full((32, 2), np.nan)
    monkeypatch.setattr("tui.draws.energies_and_widths", lambda *_: (nothing, nothing))
    slow = solved(session, 32)
    assert quick.values == pytest.approx(slow.values, rel=1e-8)
    assert quick.reached
    assert slow.reached


def test_levels_below_an_edge() -> None:
    low = replace(DEMO, conditions=replace(DEMO.conditions, bias_V=-0.2))
    found = solved(errors(low, thickness_ml=0.2), 16)
    assert found.reached
    assert all(spread.absent == 0 for spread in found.spreads)


def test_currents() -> None:
    swept = replace(DEMO, sweep=replace(DEMO.sweep, to_V=0.2))
    specs = (SpecEntry("peak bias_V", 0.1, 0.125), SpecEntry(ENERGY, 0.06))
    found = solved(errors(swept, *specs, thickness_nm=0.1), 8)
    assert found.spreads[0].sd > 1e-3
    assert found.joint is not None
    assert np.isfinite(found.values).all()


def test_an_interrupt_leaves_what_there_is() -> None:
    def progress(done: int, total: int, left_s: float) -> None:
        if done == 256:
            raise KeyboardInterrupt

    session = errors(DEMO, SpecEntry(ENERGY, 0.06, 0.066), rate_percent=1.0)
    found = tolerance(ToleranceRequest(session, 512, jobs=1), progress=progress)
    assert found.interrupted
    assert found.draws == 256
    assert found.joint is not None
    assert found.costs == ()


@pytest.mark.parametrize(
    ("session", "words"),
    [
        (errors(), "leaves nothing to chance"),
        (errors(DEMO, SpecEntry("level 9 energy_eV", 0.1), rate_percent=1.0), "has 2 levels"),
        (errors(DEMO, SpecEntry("level 1 colour", 0.1), rate_percent=1.0), "a level has"),
        (
            errors(
                replace(
                    DEMO,
                    layers=(replace(DEMO.layers[0], material=None, edge_eV=0.0, mass=0.067),),
                ),
                thickness_ml=1.0,
            ),
            "has no monolayer to count in at layer 1; state the thickness error in nm",
        ),
    ],
)
def test_refusals(session: Session, words: str) -> None:
    with pytest.raises(SessionError, match=words):
        solved(session, 8)
