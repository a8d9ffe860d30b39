"""The figure of a design: two panels on one energy axis.

Left, over position: the band edge, each level where it sits, the contacts' Fermi energies (F), and
the density at the energy in hand, which is its base line. Right, over the same rows: log10 T. A
level and its peak are on one row.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.field import Profile
from tui.figures.cells import Cells, Glyphs
from tui.figures.curves import Curve, Limits, band_of, column_of, draw, row_of, thinned
from tui.figures.ticks import round_ticks, tick_text
from tui.reading import Reading
from tui.study import Study

LABEL_WIDTH = 8
NUMBER_WIDTH = 3
AXIS_ROWS = 2
TICK_COLUMNS = 9
"""A lower axis has at most one tick in so many columns."""
MIN_WIDTH, MIN_HEIGHT = 44, 7
PANEL_SHARE = 0.60
"""Share of the width that position gets."""
PAD_ABOVE, PAD_BELOW = 0.12, 0.04
"""Room above and below the window, as shares of its span."""
CONTACT_SHARE = 0.06
"""Length of each contact that is drawn, as a share of the stack's."""
DENSITY_SHARE = 0.30
"""Height of the density, as a share of the energy axis."""
SITS_FROM = 0.08
"""Share of a level in a layer from which its stroke is drawn there."""
SEEN_FROM_DOTS = 0.5
"""A density lower than this many dots is left to the base line."""
EVEN_POINTS = 200
LOWEST_LOG10 = -60.0
"""Transmission below this runs along the panel's edge."""


@dataclass(frozen=True, eq=False)
class Base:
    """What stays while the energy in hand moves: axes, edge and transmission."""

    study: Study
    cells: Cells
    glyphs: Glyphs
    position: Limits
    log10_t: Limits
    rows: int
    position_width: int
    log10_t_width: int

    @property
    def position_column(self) -> int:
        """First column of the left panel."""
        return LABEL_WIDTH + 1

    @property
    def log10_t_column(self) -> int:
        """First column of the right panel."""
        return self.position_column + self.position_width + 1

    def row_of(self, energy_eV: float) -> int:
        """Row of an energy."""
        return row_of(energy_eV, self.position, self.rows, self.glyphs)

    def energy_step_eV(self) -> float:
        """Energy that one row stands for."""
        return (self.position.top - self.position.bottom) / self.rows

    def dot_eV(self) -> float:
        """Energy that one row of a marker's dots stands for."""
        return self.energy_step_eV() / self.glyphs.marker_rows


def base_figure(study: Study, width: int, height: int, glyphs: Glyphs) -> Base:
    """Draw what stays; ``width`` and ``height`` are in cells, at least the minima above."""
    width, height = max(width, MIN_WIDTH), max(height, MIN_HEIGHT)
    rows = height - AXIS_ROWS
    room = width - LABEL_WIDTH - 2 - NUMBER_WIDTH
    position_width = int(room * PANEL_SHARE)
    base = Base(
        study,
        Cells(width, height),
        glyphs,
        _position_limits(study),
        _log10_limits(study),
        rows,
        position_width,
        room - position_width,
    )
    # One drawing across both panels, x counted in columns: plotext costs by the drawing.
    both = Limits(0.0, room, base.position.bottom, base.position.top)
    curves = [
        _in_columns(_edge(study.profile, base), base.position, position_width, 0),
        _in_columns(_transmission(base), base.log10_t, base.log10_t_width, position_width + 1),
    ]
    base.cells.paste(draw(curves, both, room + 1, rows, glyphs), 0, base.position_column)
    _axes(base)
    _levels(base)
    _fermi_energies(base)
    return base


def figure(base: Base, reading: Reading | None) -> Cells:
    """Lay the energy in hand and its density on what stays."""
    cells = base.cells.copy()
    if reading is None or not base.position.bottom <= reading.energy_eV <= base.position.top:
        return cells
    row = base.row_of(reading.energy_eV)
    if reading.density is not None:
        _density(base, cells, reading, row)
    for column in range(LABEL_WIDTH + 1, cells.width - NUMBER_WIDTH):
        cells.put(row, column, base.glyphs.line, "line", over=False)
    label = f"{reading.energy_eV:.4f}".rjust(LABEL_WIDTH - 1) + base.glyphs.pointer
    cells.put(row, 0, label[-LABEL_WIDTH:], "pointer")
    return cells


def _position_limits(study: Study) -> Limits:
    span = study.scene.to_eV - study.scene.from_eV
    margin = CONTACT_SHARE * study.profile.length_nm
    return Limits(
        -margin,
        study.profile.length_nm + margin,
        study.scene.from_eV - PAD_BELOW * span,
        study.scene.to_eV + PAD_ABOVE * span,
    )


def _log10_limits(study: Study) -> Limits:
    spectrum = study.spectrum
    # Evenly in energy: the points crowded at a contact's edge, where T goes to 0, weigh little.
    even = np.linspace(spectrum.energy_eV[0], spectrum.energy_eV[-1], EVEN_POINTS)
    log10 = np.interp(even, spectrum.energy_eV, spectrum.log10_transmission)
    finite = log10[np.isfinite(log10)]
    low = math.floor(float(np.percentile(finite, 4.0))) if finite.size else -3
    position = _position_limits(study)
    return Limits(max(LOWEST_LOG10, min(-2.0, low)), 0.0, position.bottom, position.top)


def _edge(profile: Profile, base: Base) -> Curve:
    x = np.repeat(profile.position_nm, 2)
    inner = np.stack([profile.edge_left_eV, profile.edge_right_eV], axis=1).ravel()
    left, right = profile.contact_edge_eV
    x = np.concatenate([[base.position.left], x, [base.position.right]])
    return Curve(x, np.concatenate([[left, left], inner, [right, right]]), "edge")


def _transmission(base: Base) -> Curve:
    spectrum = base.study.spectrum
    finite = np.isfinite(spectrum.log10_transmission)
    dots = base.rows * base.glyphs.marker_rows
    energy, log10 = thinned(spectrum.energy_eV[finite], spectrum.log10_transmission[finite], dots)
    return Curve(log10, energy, "curve")


def _in_columns(curve: Curve, limits: Limits, width: int, start: int) -> Curve:
    """Say a curve's x in columns of a panel, clipped to it."""
    share = np.clip((curve.x - limits.left) / (limits.right - limits.left), 0.0, 1.0)
    return Curve(start + share * (width - 1), curve.y, curve.role)


def _axes(base: Base) -> None:
    glyphs, cells = base.glyphs, base.cells
    columns = (LABEL_WIDTH, base.log10_t_column - 1)
    for row in range(base.rows):
        for column in columns:
            cells.put(row, column, glyphs.upright, "axis")
    limits = base.position
    ticks = round_ticks(limits.bottom, limits.top, max(2, base.rows // 3))
    for tick in ticks:
        row = base.row_of(tick)
        text = tick_text(tick, ticks) + (" eV" if row == 0 else "")
        cells.put(row, 0, text.rjust(LABEL_WIDTH - 1)[: LABEL_WIDTH - 1], "axis")
        for column in columns:
            cells.put(row, column, glyphs.tick_left, "axis")
    if cells.is_blank(0, LABEL_WIDTH - 2):
        cells.put(0, 0, "eV".rjust(LABEL_WIDTH - 1), "axis")
    cells.put(base.rows, LABEL_WIDTH, glyphs.corner, "axis")
    _lower_axis(base, base.position_column, base.position_width, limits, "x nm")
    cells.put(base.rows, base.log10_t_column - 1, glyphs.cross_below, "axis")
    _lower_axis(base, base.log10_t_column, base.log10_t_width, base.log10_t, "log10 T")


def _lower_axis(base: Base, start: int, width: int, limits: Limits, title: str) -> None:
    """Draw a panel's lower axis; its title stands in the axis itself, between two ticks."""
    cells, row = base.cells, base.rows
    cells.put(row, start, base.glyphs.across * width, "axis")
    ticks = round_ticks(limits.left, limits.right, max(2, width // TICK_COLUMNS))
    columns = [column_of(tick, limits, width) for tick in ticks]
    for tick, column in zip(ticks, columns, strict=True):
        text = tick_text(tick, ticks)
        at = min(max(column - len(text) // 2, 0), width - len(text))
        cells.put(row, start + column, base.glyphs.tick_below, "axis")
        cells.put(row + 1, start + at, text, "axis")
    _axis_title(cells, row, start, [-1, *columns, width], title)


def _axis_title(cells: Cells, row: int, start: int, ends: list[int], title: str) -> None:
    """Write a title into the last gap of an axis that has room for it, or else at its end."""
    gaps = [(a, b) for a, b in itertools.pairwise(ends) if b - a - 1 >= len(title)]
    first, last = gaps[-1] if gaps else (ends[-1] - len(title) - 1, ends[-1])
    room = last - first - 1
    text = f" {title} " if room >= len(title) + 2 else title
    cells.put(row, start + first + 1 + (room - len(text)) // 2, text, "axis")


def _levels(base: Base) -> None:
    """Draw each level where it sits, and its number at the right of both panels."""
    profile, cells = base.study.profile, base.cells
    for number, level in enumerate(base.study.levels.levels, start=1):
        row = base.row_of(level.energy_eV)
        for layer, share in enumerate(level.share_by_layer):
            if share < SITS_FROM:
                continue
            pieces = np.flatnonzero(profile.layer_index == layer)
            start, stop = profile.position_nm[pieces[0]], profile.position_nm[pieces[-1] + 1]
            first, last = (column_of(x, base.position, base.position_width) for x in (start, stop))
            stroke = base.glyphs.level * max(1, last - first - 1)
            cells.put(row, base.position_column + first + 1, stroke, "level", over=False)
        at = cells.width - NUMBER_WIDTH
        if cells.is_blank(row, at + 1) and cells.is_blank(row, at + 2):
            cells.put(row, at, str(number).rjust(NUMBER_WIDTH), "level")


def _fermi_energies(base: Base) -> None:
    """Mark each contact's Fermi energy at its side of the left panel."""
    structure, profile = base.study.scene.structure, base.study.profile
    ends = (base.position_column, base.log10_t_column - 2)
    contacts = (structure.left, structure.right)
    for contact, edge, column in zip(contacts, profile.contact_edge_eV, ends, strict=True):
        if contact.fermi_eV is None:
            continue
        fermi = edge + contact.fermi_eV
        if base.position.bottom <= fermi <= base.position.top:
            base.cells.put(base.row_of(fermi), column, "F", "fermi")


def _density(base: Base, cells: Cells, reading: Reading, row: int) -> None:
    """Draw the density as a curve on the base line, with its area dotted."""
    density = reading.density
    if density is None:
        return
    heights = _heights(density.density_per_nm, base, reading.energy_eV)
    x, y = thinned(density.x_nm, heights, base.position_width)
    top, bottom = max(base.row_of(float(y.max())), 0), row
    y[y - reading.energy_eV < SEEN_FROM_DOTS * base.dot_eV()] = np.nan
    band = band_of(base.position, base.rows, base.glyphs, top, bottom)
    curve = Curve(x, y, "density")
    drawn = draw([curve], band, base.position_width, bottom - top + 1, base.glyphs)
    cells.paste_under(drawn, top, base.position_column, ("edge", "level"))
    for column in range(base.position_width):
        marked = [n for n in range(drawn.height) if not drawn.is_blank(n, column)]
        if marked:
            for n in range(top + marked[0] + 1, row):
                at = base.position_column + column
                cells.put(n, at, base.glyphs.fill, "fill", over=False)


def _heights(
    density_per_nm: NDArray[np.float64], base: Base, energy_eV: float
) -> NDArray[np.float64]:
    """Energies that the density's curve runs through."""
    span = base.position.top - base.position.bottom
    room = max(0.5 * DENSITY_SHARE * span, min(DENSITY_SHARE * span, base.position.top - energy_eV))
    heights: NDArray[np.float64] = energy_eV + density_per_nm / density_per_nm.max() * room
    return heights
