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

from physics.field import Profile
from physics.structure import Layer
from tui.figures.axes import lower_axis
from tui.figures.cells import Cells, Glyphs
from tui.figures.curves import (
    Curve,
    FloatArray,
    Limits,
    band_of,
    column_of,
    draw,
    outline,
    row_of,
    thinned,
)
from tui.figures.ticks import round_ticks, tick_text
from tui.reading import Reading
from tui.study import Study

LABEL_WIDTH = 8
NUMBER_WIDTH = 3
AXIS_ROWS = 2
MIN_WIDTH, MIN_HEIGHT = 44, 7
PANEL_SHARE = 0.60
"""Share of the width that position gets."""
PAD_ABOVE, PAD_BELOW = 0.18, 0.04
"""Room above and below the window, as shares of its span."""
WALL_COLUMNS = 2.5
"""Columns that a wall needs on the average to be drawn."""
CONTACT_SHARE, BENT_CONTACT_SHARE = 0.06, 0.15
"""Length of each contact that is drawn, as a share of the stack's; where its edge is bent."""
DENSITY_SHARE, LEAST_DENSITY = 0.30, 0.10
"""Largest and least height of the density, as shares of the energy axis."""
SITS_FROM = 0.08
"""Share of a level in a layer from which its stroke is drawn there ..."""
SITS_FROM_MOST = 0.5
"""... or, where it is spread thin, share of its largest share."""
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

    @property
    def layers(self) -> tuple[Layer, ...]:
        """The layers that are drawn."""
        return self.study.scene.structure.layers

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
    edges = _edges(study.profile, base)
    curves = [
        *(_in_columns(edge, base.position, position_width, 0) for edge in edges),
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
    left, right = study.profile.faces_nm
    bent = study.scene.screening is not None
    margin = (BENT_CONTACT_SHARE if bent else CONTACT_SHARE) * (right - left)
    return Limits(
        left - margin,
        right + margin,
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


def _edges(profile: Profile, base: Base) -> list[Curve]:
    """Draw the band edge; of walls too close to be told apart, their lower and upper outline."""
    x = np.repeat(profile.position_nm, 2)[1:-1]
    inner = np.stack([profile.edge_left_eV, profile.edge_right_eV], axis=1).ravel()
    walls = np.count_nonzero(np.diff(inner)[1::2])
    if walls * WALL_COLUMNS <= base.position_width:
        return [_with_contacts(x, inner, base)]
    parts = outline(x, inner, base.position_width)
    return [_with_contacts(x[n], inner[n], base) for n in parts]


def _with_contacts(x_nm: FloatArray, edge_eV: FloatArray, base: Base) -> Curve:
    """Go on with an edge into both contacts, down or up their faces, as far as is drawn."""
    profile = base.study.profile
    ends = np.array([base.position.left, base.position.right])
    seen = (x_nm > ends[0]) & (x_nm < ends[1])
    faces = np.clip([profile.start_nm, profile.end_nm], *ends)
    x_nm, edge_eV = x_nm[seen], edge_eV[seen]
    left, right = profile.edge_eV(ends)
    x = np.concatenate([[ends[0], faces[0]], x_nm, [faces[1], ends[1]]])
    return Curve(x, np.concatenate([[left, left], edge_eV, [right, right]]), "edge")


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
    glyphs, cells, limits = base.glyphs, base.cells, base.position
    columns = (LABEL_WIDTH, base.log10_t_column - 1)
    for row in range(base.rows):
        for column in columns:
            cells.put(row, column, glyphs.upright, "axis")
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
    cells.put(base.rows, base.log10_t_column - 1, glyphs.cross_below, "axis")
    for start, width, seen, title in (
        (base.position_column, base.position_width, limits, "x nm"),
        (base.log10_t_column, base.log10_t_width, base.log10_t, "log10 T"),
    ):
        cells.paste(lower_axis(width, seen, title, glyphs), base.rows, start)


def _levels(base: Base) -> None:
    """Draw each level where it sits, and its number at the right of both panels."""
    spans, cells, taken = _layer_columns(base), base.cells, set()
    for number, level in enumerate(base.study.levels.levels, start=1):
        row = base.row_of(level.energy_eV)
        if row in taken:  # there is one line for all of them
            continue
        taken.add(row)
        least = min(SITS_FROM, SITS_FROM_MOST * max(level.share_by_layer))
        for (first, last), share in zip(spans, level.share_by_layer, strict=True):
            if share >= least:
                stroke = base.glyphs.level * max(1, last - first - 1)
                cells.put(row, base.position_column + first + 1, stroke, "level", over=False)
        cells.put(row, cells.width - NUMBER_WIDTH, str(number).rjust(NUMBER_WIDTH), "level")


def _layer_columns(base: Base) -> list[tuple[int, int]]:
    """First and last column of each layer."""
    faces = np.concatenate([[0.0], np.cumsum([x.thickness_nm for x in base.layers])])
    columns = [column_of(x, base.position, base.position_width) for x in faces]
    return list(itertools.pairwise(columns))


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
    seen = (density.x_nm >= base.position.left) & (density.x_nm <= base.position.right)
    heights = _heights(density.density_per_nm[seen], base, reading.energy_eV)
    x, y = thinned(density.x_nm[seen], heights, base.position_width)
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


def _heights(density_per_nm: FloatArray, base: Base, energy_eV: float) -> FloatArray:
    """Energies that the density's curve runs through."""
    span = base.position.top - base.position.bottom
    room = min(DENSITY_SHARE * span, base.position.top - energy_eV)
    room = max(room, LEAST_DENSITY * span)
    heights: FloatArray = energy_eV + density_per_nm / density_per_nm.max() * room
    return heights
