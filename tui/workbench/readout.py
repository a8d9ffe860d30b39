"""What is read off at the energy in hand, and the table of levels, as lines."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence

from physics.levels import Level
from physics.structure import Layer, Structure
from tui.reading import Reading
from tui.report import quantities
from tui.report.layout import columns
from tui.report.text import LEVEL_HEAD, level_row
from tui.study import Study

Styled = list[tuple[str, str]]
SHARE_FROM = 0.05
"""A layer with less of a level is not named."""


def reading_lines(study: Study, reading: Reading, width: int) -> list[Styled]:
    """Say what is at the energy in hand, in three lines."""
    near = reading.level or _nearest(study, reading.energy_eV)
    lines = [_at_energy(study, reading)]
    if near is None:
        lines.append([("no level in the window", "faint")])
    else:
        number = study.levels.levels.index(near) + 1
        in_hand = reading.level is not None
        lines += _about_level(study, near, number, width, is_in_hand=in_hand)
    return [cut_to(line, width) for line in lines]


def level_lines(study: Study, reading: Reading | None, height: int) -> list[Styled]:
    """Write the table of levels, the one in hand marked, around it where not all fit."""
    rows = [
        level_row(number, level, study.scene.structure.layers)
        for number, level in enumerate(study.levels.levels, start=1)
    ]
    if not rows:
        return [[("no level in the window", "faint")]]
    text = columns(LEVEL_HEAD, rows, left_aligned=(8,)).rstrip("\n").split("\n")
    here = reading.number if reading is not None else None
    room = max(1, height - 1)
    top = max(0, min((here or 1) - 1 - room // 2, len(rows) - room))
    lines: list[Styled] = [[(text[0], "head")]]
    seen = range(top + 1, min(top + room, len(rows)) + 1)
    return lines + [[(text[number], "cursor" if number == here else "")] for number in seen]


def standing(study: Study | None, trouble: str, waited_s: float) -> str:
    """Say how the answer that is shown stands, in a few words.

    Parameters
    ----------
    waited_s : float
        How long the next one has been computed; 0 where that is not worth saying.
    """
    shown = "" if study is None else "old answer shown"
    if waited_s:
        return "; ".join(part for part in (f"computing {waited_s:.0f} s", shown) if part)
    if trouble:
        return shown or "no answer"
    count = 0 if study is None else len(study.advice)
    return f"{count} note{'s' * (count > 1)}: i" if count else ""


def note_lines(notes: list[str], room: int) -> list[Styled]:
    """Write the notes below each other, under a head."""
    if not notes:
        return [[("no notes on this answer", "faint")]]
    broken = [part for note in notes for part in wrapped(note, room)]
    return [[("notes on this answer", "head")], *([(part, "")] for part in broken)]


def wrapped(text: str, width: int) -> list[str]:
    """Break a note into lines, the later ones indented."""
    return textwrap.wrap(text, max(20, width), initial_indent="- ", subsequent_indent="  ")


def dimmed(lines: Sequence[Sequence[tuple[str, str]]]) -> list[Styled]:
    """Show lines as those of an answer to something else than is there now."""
    return [[("".join(text for text, _ in line), "faint")] for line in lines]


def _at_energy(study: Study, reading: Reading) -> Styled:
    t = quantities.probability(reading.transmission, reading.log10_transmission)
    dwell = quantities.duration(reading.dwell_time_s)
    said: Styled = [
        (f" E {reading.energy_eV:.6f} eV ", "pointer"),
        ("  T ", "faint"),
        (t, "strong"),
        ("  dwell ", "faint"),
        (dwell, "strong"),
    ]
    if reading.density is None:
        said.append(("  both contacts are closed here", "faint"))
    count = len(study.levels.levels)
    proof = "proved complete" if study.levels.complete else "COUNT NOT PROVED"
    plural = "level" if count == 1 else "levels"
    said.append((f"  {count} {plural}, {proof}", "faint" if study.levels.complete else "trouble"))
    return said


def _about_level(
    study: Study, level: Level, number: int, width: int, *, is_in_hand: bool
) -> list[Styled]:
    name = f" level {number}" + ("" if is_in_hand else " (nearest)")
    first: Styled = [
        (f"{name} ", "level"),
        (f" {1e3 * level.energy_eV:.4f} meV", "strong"),
        ("  width ", "faint"),
        (quantities.width(level.width_eV, level.log10_width_eV), "strong"),
        ("  lifetime ", "faint"),
        (quantities.duration(level.lifetime_s), "strong"),
        ("  nodes ", "faint"),
        (str(level.nodes), "strong"),
    ]
    second: Styled = [("   ", "")]
    if level.kind == "quasi-bound":
        second += [
            ("left ", "faint"),
            (quantities.energy(level.left_width_eV), "strong"),
            ("  right ", "faint"),
            (quantities.energy(level.right_width_eV), "strong"),
            ("  peak T ", "faint"),
            (f"{level.peak_transmission:.4g}", "strong"),
        ]
    else:
        second.append(("bound", "strong"))
    second.append(("  in ", "faint"))
    room = width - sum(len(text) for text, _ in second)
    second.append((_places(level, study.scene.structure, room), "strong"))
    return [first, second]


def _places(level: Level, structure: Structure, room: int) -> str:
    """Name the layers that hold most of a level, as many as there is room for."""
    ranked = sorted(enumerate(level.share_by_layer), key=lambda item: -item[1])
    named = [
        f"{_layer_name(n, structure.layers[n])} {100.0 * share:.0f} %"
        for n, share in ranked[:4]
        if share >= SHARE_FROM
    ]
    while len(named) > 1 and len(", ".join(named)) > room:
        named.pop()
    return ", ".join(named) or "many layers"


def _layer_name(index: int, layer: Layer) -> str:
    label = layer.label or layer.name
    return f"{index + 1} {label}".strip()


def _nearest(study: Study, energy_eV: float) -> Level | None:
    levels = study.levels.levels
    return min(levels, key=lambda level: abs(level.energy_eV - energy_eV), default=None)


def cut_to(line: Styled, width: int) -> Styled:
    """Cut a line to a width."""
    cut: Styled = []
    room = width
    for text, role in line:
        if room > 0:
            cut.append((text[:room], role))
        room -= len(text)
    return cut
