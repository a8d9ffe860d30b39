"""Tolerances as CSV, JSON and words."""

from __future__ import annotations

import math
from dataclasses import asdict

from tui.chance import Plan
from tui.estimate import Linear, bounds, sources_of
from tui.report.objects import Object
from tui.report.tables import csv_text
from tui.tolerance import Cost, Tolerance
from tui.yields import SCRAMBLINGS, Yield

COLUMNS = (
    "result",
    "nominal",
    "mean",
    "sd",
    "p05",
    "p50",
    "p95",
    "at_least",
    "at_most",
    "yield",
    "yield_low",
    "yield_high",
)
METHOD = f"Student's t, {SCRAMBLINGS} scramblings"


def tolerance_table(found: Tolerance) -> str:
    """Write one line a result."""
    return csv_text(COLUMNS, [[row[name] for name in COLUMNS] for row in _rows(found)])


def draws_table(found: Tolerance) -> str:
    """Write one line a draw: its variables in standard deviations, then its results."""
    names = [variable.name for variable in found.plan.errors.variables]
    results = [one.text for one in found.plan.outcomes]
    rows = [
        [*inputs, *values]
        for inputs, values in zip(found.inputs.tolist(), found.values.tolist(), strict=True)
    ]
    return csv_text([*names, *results], rows)


def tolerance_object(found: Tolerance) -> Object:
    """Give the whole answer."""
    joint = found.joint
    return {
        "results": _rows(found),
        "yield": None if joint is None else joint.value,
        "interval": None if joint is None else _interval(joint),
        "sources": [_source(cost, found.plan) for cost in found.costs],
        "linear": _linear(found.linear, found.plan),
        "draws": found.draws,
        "seed": found.seed,
        "missed": found.missed,
        "interrupted": found.interrupted,
    }


def _rows(found: Tolerance) -> list[Object]:
    plan = found.plan
    nominal = found.linear.slopes.value.tolist()
    low, high = (ends.tolist() for ends in bounds(plan)) if plan.session.specs else ([], [])
    rows: list[Object] = []
    for n, (one, spread) in enumerate(zip(plan.outcomes, found.spreads, strict=True)):
        share = found.yields[n]
        rows.append(
            {
                "result": one.text,
                "nominal": nominal[n],
                **asdict(spread),
                "at_least": low[n] if low else math.nan,
                "at_most": high[n] if high else math.nan,
                "yield": math.nan if share is None else share.value,
                "yield_low": math.nan if share is None else share.low,
                "yield_high": math.nan if share is None else share.high,
            }
        )
    return rows


def _interval(share: Yield) -> Object:
    return {
        "low": share.low,
        "high": share.high,
        "level": 0.95,
        "method": METHOD,
        "wilson_low": share.wilson_low,
        "wilson_high": share.wilson_high,
    }


def _source(cost: Cost, plan: Plan) -> Object:
    without = cost.without
    return {
        "source": cost.source,
        "variables": list(cost.variables),
        "yield_without": None if without is None else without.value,
        "gain": cost.gain,
        "gain_low": cost.gain_low,
        "gain_high": cost.gain_high,
        "sd_without": {one.text: sd for one, sd in zip(plan.outcomes, cost.sd, strict=True)},
    }


def _linear(linear: Linear, plan: Plan) -> Object:
    names = [variable.name for variable in plan.errors.variables]
    sources = sources_of(plan)
    results = [
        {
            "result": one.text,
            "sd": float(linear.sd[n]),
            "yield": linear.yields[n],
            "per_sd": dict(zip(names, linear.slopes.slope[n].tolist(), strict=True)),
            "per_square": float(linear.slopes.bend[n].sum()),
            "variance_share": dict(zip(sources, linear.share[n].tolist(), strict=True)),
        }
        for n, one in enumerate(plan.outcomes)
    ]
    return {"results": results, "yield": linear.joint}


def linear_said(found: Tolerance) -> list[str]:
    """Say the linear estimate in words."""
    linear, plan = found.linear, found.plan
    lines = []
    for n, one in enumerate(plan.outcomes):
        shares = zip(sources_of(plan), linear.share[n].tolist(), strict=True)
        ranked = sorted(shares, key=lambda item: -item[1])
        parts = ", ".join(f"{100.0 * share:.0f} % {name}" for name, share in ranked if share > 0.0)
        nominal, spread = float(linear.slopes.value[n]), float(linear.sd[n])
        parts = f", of its variance {parts}" if parts else ""
        lines.append(f"linear estimate: {one.text} {nominal:.6g}, spread {spread:.2g}{parts}")
        if not math.isfinite(spread):
            lines[-1] = f"linear estimate: {one.text} is not known again near the design"
    if linear.joint is not None:
        lines.append(f"linear estimate: joint yield {100.0 * linear.joint:.1f} %")
    return lines


def yield_said(found: Tolerance) -> list[str]:
    """Say the joint yield and what each source of error costs in words."""
    lines = []
    joint = found.joint
    if joint is not None:
        lines.append(
            f"joint yield {_percent(joint.value)}, from {_percent(joint.low)} to "
            f"{_percent(joint.high)} (95 %, {METHOD}; {found.draws} draws, seed {found.seed}; as "
            f"independent draws {_percent(joint.wilson_low)} to {_percent(joint.wilson_high)})"
        )
    else:
        lines.append(f"{found.draws} draws, seed {found.seed}; no [[spec]], so no yield")
    for rank, cost in enumerate(found.costs, start=1):
        without = math.nan if cost.without is None else cost.without.value
        lines.append(
            f"cost {rank}: {cost.source}: without it the yield is {_percent(without)}, "
            f"{100.0 * cost.gain:+.1f} points ({100.0 * cost.gain_low:+.1f} to "
            f"{100.0 * cost.gain_high:+.1f})"
        )
    absent = max((spread.absent for spread in found.spreads), default=0)
    if absent:
        lines.append(f"note: up to {absent} of {found.draws} draws lack a result; they fail")
    if found.missed:
        lines.append(
            f"note: accuracy: {found.missed} computations of draws missed their accuracy, were "
            "refused, or lost a level"
        )
    return lines


def _percent(share: float) -> str:
    return f"{100.0 * share:.1f} %"
