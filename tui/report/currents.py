"""Current curves as CSV, JSON and text."""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

import numpy as np

from physics.device import Figures
from physics.extremes import Region
from physics.tracks import followed
from tui.report import quantities
from tui.report.layout import columns
from tui.report.tables import csv_text
from tui.sweep import Sweep

Object = dict[str, Any]

POINTS = (
    "bias_V",
    "current_density_A_per_cm2",
    "error_A_per_cm2",
    "conductance_S_per_cm2",
)
SAMPLES = 13
"""Biases at which the report quotes the current."""


def sweep_table(sweep: Sweep) -> str:
    """Write one bias a line, with each level's energy and share of the current."""
    energy, share = _by_level(sweep)
    header = list(POINTS)
    parts = [np.stack([*_points(sweep)], axis=1)]
    for n in range(energy.shape[1]):
        header += [f"level_{n + 1}_eV", f"level_{n + 1}_share"]
        parts.append(np.stack([energy[:, n], share[:, n]], axis=1))
    return csv_text(header, np.concatenate(parts, axis=1).tolist())


def sweep_object(sweep: Sweep) -> Object:
    """Say the whole curve and its features."""
    curve = sweep.curve
    energy, share = _by_level(sweep)
    main = None if sweep.main is None else _region(sweep.main)
    return {
        **{name: values.tolist() for name, values in zip(POINTS, _points(sweep), strict=True)},
        "reached": curve.reached.tolist(),
        "peak": None if main is None else main["peak"],
        "valley": None if main is None else main["valley"],
        "peak_to_valley": None if main is None else main["peak_to_valley"],
        "onset_V": None if main is None else main["onset_V"],
        "regions": [_region(region) for region in sweep.regions],
        "levels": [
            {"number": n + 1, "energy_eV": energy[:, n].tolist(), "share": share[:, n].tolist()}
            for n in range(energy.shape[1])
        ],
        "figures": None if sweep.figures is None else asdict(sweep.figures),
        "notes": list(sweep.notes),
    }


def features_said(sweep: Sweep) -> list[str]:
    """Say peak, valley and what follows from them, a line each."""
    main = sweep.main
    if main is None:
        return []
    lines = [f"peak {_at(main.peak.bias_V, main.peak.current_density_A_per_cm2)}"]
    if main.valley is not None:
        lines.append(f"valley {_at(main.valley.bias_V, main.valley.current_density_A_per_cm2)}")
    if main.peak_to_valley is not None:
        lines.append(f"peak to valley {main.peak_to_valley:.4g}")
    if main.onset_V is not None:
        lines.append(f"onset {main.onset_V:.5g} V")
    others = len(sweep.regions) - 1
    if others:
        lines.append(f"{others} more peaks in this range; --json lists them")
    return lines


def sweep_text(sweep: Sweep) -> str:
    """Write the report's part on the current."""
    curve = sweep.curve
    at = np.unique(np.linspace(0, curve.bias_V.size - 1, SAMPLES).round().astype(int))
    rows = [
        [
            f"{curve.bias_V[n]:.4f}",
            f"{curve.current_density_A_per_cm2[n]:.6g}",
            f"{curve.error_A_per_cm2[n]:.0e}",
            f"{sweep.conductance_S_per_cm2[n]:.4g}",
        ]
        for n in at
    ]
    head = ("bias V", "J A/cm2", "error", "dJ/dV S/cm2")
    lines = [f"- {line}" for line in features_said(sweep)]
    if sweep.figures is not None:
        lines += [f"- {name} {value}" for name, value in figure_lines(sweep.figures)]
    lines += [f"- {note}" for note in sweep.notes]
    return columns(head, rows, left_aligned=()) + "".join(f"{line}\n" for line in lines)


def figure_lines(figures: Figures) -> list[tuple[str, str]]:
    """Name each figure that is there, and write it with its unit."""
    said = [
        ("peak", f"{figures.peak_kA_per_cm2:.4g} kA/cm2 = {figures.peak_mA_per_um2:.4g} mA/um2"),
        ("voltage swing", _with(figures.voltage_swing_V, "V")),
        ("available power", _with(figures.available_power_W_per_cm2, "W/cm2")),
        ("steepest dJ/dV", _with(figures.negative_conductance_S_per_cm2, "S/cm2")),
        ("space-charge capacitance", _with(_times(figures.space_charge_F_per_cm2, 1e6), "uF/cm2")),
        ("quantum capacitance", _with(_times(figures.quantum_F_per_cm2, 1e6), "uF/cm2")),
        ("dwell time", _time(figures.dwell_time_s)),
        ("transit time", _time(figures.transit_time_s)),
        ("dissipation", _with(figures.dissipated_W_per_cm2, "W/cm2")),
        ("peak current", _with(_times(figures.peak_current_A, 1e3), "mA")),
        ("available power of the mesa", _with(_times(figures.available_power_W, 1e6), "uW")),
        ("negative resistance", _with(figures.negative_resistance_ohm, "ohm")),
        ("cut-off", _with(_times(figures.cutoff_Hz, 1e-9), "GHz")),
    ]
    if figures.cutoff_said:
        said[-1] = ("no cut-off:", figures.cutoff_said)
    return [(name, text) for name, text in said if text]


def _points(sweep: Sweep) -> list[np.ndarray[Any, Any]]:
    """Give the columns of `POINTS`."""
    values = [getattr(sweep.curve, name) for name in POINTS[:-1]]
    return [*values, sweep.conductance_S_per_cm2]


def _by_level(sweep: Sweep) -> tuple[np.ndarray[Any, Any], np.ndarray[Any, Any]]:
    energy, current = followed(sweep.curve)
    total = sweep.curve.current_density_A_per_cm2[:, None]
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where(total != 0.0, current / total, np.nan)
    return energy, share


def _region(region: Region) -> Object:
    return {
        "peak": asdict(region.peak),
        "valley": None if region.valley is None else asdict(region.valley),
        "peak_to_valley": region.peak_to_valley,
        "onset_V": region.onset_V,
        "steepest_rise": None if region.steepest_rise is None else asdict(region.steepest_rise),
        "steepest_fall": None if region.steepest_fall is None else asdict(region.steepest_fall),
    }


def _at(bias_V: float, current: float) -> str:
    return f"{current:.6g} A/cm2 at {bias_V:.6g} V"


def _with(value: float | None, unit: str) -> str:
    return "" if value is None else f"{value:.4g} {unit}"


def _times(value: float | None, factor: float) -> float | None:
    return None if value is None else value * factor


def _time(value_s: float | None) -> str:
    return "" if value_s is None else quantities.duration(value_s)
