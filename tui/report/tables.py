"""Results as CSV: one header line of names with units, numbers to full precision.

A number that cannot be said (the lifetime of a bound level, the logarithm of 0) is an empty cell.
"""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Iterable, Iterator, Sequence

from physics.levels import LevelSet
from physics.scattering import Scattering
from physics.wavefunction import Density

SPECTRUM = ("energy_eV", "transmission", "log10_transmission", "reflection")
LEVELS = (
    "level",
    "energy_eV",
    "width_eV",
    "lifetime_s",
    "left_width_eV",
    "right_width_eV",
    "peak_transmission",
    "kind",
    "nodes",
    "main_layer",
    "main_layer_share",
    "log10_width_eV",
    "width_error",
)
PROFILE = ("x_nm", "edge_eV", "density_per_nm")


def spectrum_table(spectrum: Scattering) -> str:
    """Write T and R over energy."""
    return "".join(spectrum_table_parts([spectrum]))


def spectrum_table_parts(parts: Iterable[Scattering]) -> Iterator[str]:
    """Write T and R over energy, part by part: the whole may be too much to hold."""
    header = csv_text(SPECTRUM, [])
    for part in parts:
        columns = [getattr(part, name).tolist() for name in SPECTRUM]
        yield header + _rows(zip(*columns, strict=True))
        header = ""


def levels_table(levels: LevelSet) -> str:
    """Write one level a line, numbered from 1."""
    rows = []
    for number, level in enumerate(levels.levels, start=1):
        layer, share = main_layer(level.share_by_layer)
        named = [getattr(level, name) for name in LEVELS[1:9]]
        rows.append([number, *named, layer, share, level.log10_width_eV, level.width_error])
    return csv_text(LEVELS, rows)


def profile_table(density: Density) -> str:
    """Write band edge and density over position."""
    columns = [getattr(density, name).tolist() for name in PROFILE]
    return csv_text(PROFILE, zip(*columns, strict=True))


def main_layer(share_by_layer: Sequence[float]) -> tuple[int, float]:
    """Find the layer, counted from 1, that holds most of a level, and its share."""
    share = max(share_by_layer)
    return share_by_layer.index(share) + 1, share


def csv_text(header: Sequence[str], rows: Iterable[Sequence[object]]) -> str:
    """Write a table with its header."""
    return _rows([header]) + _rows(rows)


def _rows(rows: Iterable[Sequence[object]]) -> str:
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerows([_cell(value) for value in row] for row in rows)
    return text.getvalue()


def _cell(value: object) -> object:
    return "" if isinstance(value, float) and not math.isfinite(value) else value
