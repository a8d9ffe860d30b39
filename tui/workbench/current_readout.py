"""What is read off a current curve, as lines: the bias in hand, peak and valley, the device."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from physics.device import Figures
from physics.extremes import Region
from tui.amounts import amount
from tui.bias_point import BiasPoint
from tui.branches import Branch, sign_of
from tui.report import quantities
from tui.sweep import Sweep
from tui.workbench.readout import Styled, cut_to, wrapped

DENSITY, SLOPE, CAPACITANCE = "A/cm2", "S/cm2", "F/cm2"
SAID_FROM = 5e-4
"""A level with a smaller share is not named."""
MORE = " i: more"
Item = tuple[str, str]
"""A name and what it is."""


def current_lines(
    sweep: Sweep,
    branches: tuple[Branch, ...],
    point: BiasPoint | None,
    width: int,
    height: int,
) -> list[Styled]:
    """Say what is at the bias in hand, and below what fits of the curve's and device's figures."""
    if point is None:
        lines: list[Styled] = [[(" the bias in hand is outside the curve, ", "faint")]]
        lines[0] += _strong(_range(sweep))
    else:
        lines = [_at_bias(sweep, branches, point, width)]
    if not sweep.refined:
        said = "peaks and valleys are sought when the curve is done"
        return [*lines, [(f" {said}", "faint")]]
    if sweep.main is None:
        return [*lines, [(" no peak between ", "faint"), *_strong(_range(sweep))]]
    lines += _flowed(summary(sweep), width, height - 1)
    return [cut_to(line, width) for line in lines]


def summary(sweep: Sweep) -> list[Item]:
    """List what a reader asks for, the most important first."""
    region, figures = sweep.main, sweep.figures
    if region is None:
        return []
    name = _number(sweep, region)
    current = region.peak.current_density_A_per_cm2
    size = f"{amount(current, DENSITY)} = {1e-5 * abs(current):.4g} mA/um2"
    items = [(f"P{name}", f"{size} at {region.peak.bias_V:.4f} V")]
    if region.valley is not None:
        at = region.valley.bias_V, region.valley.current_density_A_per_cm2
        items.append((f"V{name}", _point(*at)))
    items += _shape(region)
    return items if figures is None else items + _device(figures)[1:]  # P says the first


def report(sweep: Sweep) -> list[str]:
    """Write everything out for the reader: features, figures of the device, notes."""
    lines = [f"Current from {_range(sweep)}, {sweep.curve.bias_V.size} points", ""]
    for number, region in enumerate(sweep.regions, start=1):
        lines += [*_about_region(number, region), ""]
    if sweep.main is not None and sweep.figures is not None:
        lines.append(f"Figures of P{_number(sweep, sweep.main)} and the fall behind it")
        lines += [f"  {name:<24} {value}" for name, value in _device(sweep.figures)]
        lines.append("")
    return [*lines, *(line for note in sweep.notes for line in [*wrapped(note, 70), ""])]


def _number(sweep: Sweep, region: Region) -> int:
    return sweep.regions.index(region) + 1 if region in sweep.regions else 1


def _about_region(number: int, region: Region) -> list[str]:
    lines = []
    for letter, word, point in (("P", "peak", region.peak), ("V", "valley", region.valley)):
        if point is not None:
            said = _point(point.bias_V, point.current_density_A_per_cm2, 6)
            error = amount(point.error_A_per_cm2, DENSITY, 2)
            lines.append(f"{letter}{number}  {word:<10} {said}, known to {error}")
    return [*lines, *(f"    {name:<10} {value}" for name, value in _shape(region))]


def _shape(region: Region) -> list[Item]:
    items = []
    if region.peak_to_valley is not None:
        items.append(("ratio", f"{region.peak_to_valley:.4g}"))
    if region.onset_V is not None:
        items.append(("onset", f"{region.onset_V:.4f} V"))
    return items


def _device(figures: Figures) -> list[Item]:
    """List the figures that there are."""
    per_area = [
        ("peak", f"{figures.peak_kA_per_cm2:.4g} kA/cm2 = {figures.peak_mA_per_um2:.4g} mA/um2"),
        ("swing", _swing(figures)),
        ("power", _amount(figures.available_power_W_per_cm2, "W/cm2")),
        ("heat", amount(figures.dissipated_W_per_cm2, "W/cm2", 3)),
        ("cut-off", _cutoff(figures)),
        ("steepest fall", _amount(figures.negative_conductance_S_per_cm2, SLOPE)),
        ("C plates", amount(figures.space_charge_F_per_cm2, CAPACITANCE)),
        ("C quantum", _amount(figures.quantum_F_per_cm2, CAPACITANCE)),
        ("dwell", _duration(figures.dwell_time_s)),
        ("transit", _duration(figures.transit_time_s)),
        ("peak current", _amount(figures.peak_current_A, "A")),
        ("mesa's power", _amount(figures.available_power_W, "W")),
        ("mesa's -R", _amount(figures.negative_resistance_ohm, "ohm")),
    ]
    return [(name, value) for name, value in per_area if value]


def _cutoff(figures: Figures) -> str:
    if figures.cutoff_Hz is None:
        return f"none: {figures.cutoff_said}"
    return amount(figures.cutoff_Hz, "Hz")


def _swing(figures: Figures) -> str:
    if figures.voltage_swing_V is None or figures.current_swing_A_per_cm2 is None:
        return ""
    return f"{figures.voltage_swing_V:.4g} V, {amount(figures.current_swing_A_per_cm2, DENSITY)}"


def _amount(value: float | None, unit: str) -> str:
    return "" if value is None else amount(value, unit)


def _duration(value_s: float | None) -> str:
    return "" if value_s is None else quantities.duration(value_s)


def _point(bias_V: float, current: float, digits: int = 4) -> str:
    return f"{amount(current, DENSITY, digits)} at {bias_V:.{digits}f} V"


def _range(sweep: Sweep) -> str:
    return f"{sweep.from_V:g} to {sweep.to_V:g} V"


def _at_bias(sweep: Sweep, branches: tuple[Branch, ...], point: BiasPoint, width: int) -> Styled:
    about = "" if point.is_exact else "~"
    current = point.current_density_A_per_cm2
    line: Styled = [
        (f" {point.bias_V:.4f} V ", "pointer"),
        ("  J ", "faint"),
        (f"{about}{amount(current, DENSITY)}", "strong"),
    ]
    if point.is_exact:
        line.append((f" +- {amount(point.error_A_per_cm2, DENSITY, 1)}", "faint"))
    line += [("  dJ/dV ", "faint"), (f"{about}{amount(point.conductance_S_per_cm2, SLOPE)}", "")]
    for sign, share in _shares(sweep, branches, point):
        more: Styled = [("  level ", "faint"), (sign, "level"), (f" {share}", "strong")]
        if _size(line) + _size(more) > width:
            more = [("  ", ""), (sign, "level"), (f" {share}", "strong")]
        if _size(line) + _size(more) <= width:
            line += more
    return line


def _shares(
    sweep: Sweep, branches: tuple[Branch, ...], point: BiasPoint
) -> Iterable[tuple[str, str]]:
    """Give each level's number and share at the bias in hand, the largest first."""
    bias = sweep.curve.bias_V
    pairs = zip(point.level_eV, point.level_share, strict=True)
    for energy, share in sorted(pairs, key=lambda pair: -abs(pair[1])):
        sign = sign_of(branches, bias, point.bias_V, energy)
        if sign and abs(share) >= SAID_FROM:
            yield sign, f"{100.0 * share:.1f} %"


def _flowed(items: Sequence[Item], width: int, height: int) -> list[Styled]:
    """Write items one behind the other into a few lines; say that there are more."""
    lines: list[Styled] = [[]]
    for name, value in items:
        item: Styled = [(f" {name} ", "faint"), (f"{value} ", "strong")]
        last = len(lines) == max(1, height)
        room = width - (len(MORE) if last else 0)
        if _size(lines[-1]) + _size(item) <= room or not lines[-1]:
            lines[-1] += item
        elif not last:
            lines.append(item)
        else:
            kept = cut_to(lines[-1], room)
            lines[-1] = [*kept, (" " * (room - _size(kept)) + MORE, "faint")]
            break
    return lines


def _strong(text: str) -> Styled:
    return [(text, "strong")]


def _size(line: Styled) -> int:
    return sum(len(text) for text, _ in line)
