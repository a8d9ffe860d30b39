"""The whole answer for a reader, as plain text in ASCII but for what the user typed."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from physics.field import built_in_eV
from physics.levels import Level
from physics.structure import Contact, Layer
from tui.report import quantities
from tui.report.currents import sweep_text
from tui.report.layout import columns
from tui.report.tables import main_layer
from tui.study import Study
from tui.sweep import Sweep

SAMPLES = 11
"""Energies at which the transmission is quoted."""
STACK_HEAD = ("", "name", "material", "nm", "ml", "edge eV", "mass", "donors cm-3", "biased eV")
LEVEL_HEAD = (
    "",
    "energy meV",
    "width",
    "lifetime",
    "left",
    "right",
    "peak T",
    "nodes",
    "mainly in",
)


def report_text(study: Study, source: str, sweep: Sweep | None = None) -> str:
    """Write the report.

    Parameters
    ----------
    study : Study
        The answer.
    source : str
        Where the session came from.
    sweep : Sweep, optional
        The current curve.
    """
    no_current = "none: state donors_cm3 or fermi_eV of both contacts\n"
    parts = [
        _heading(study, source),
        "Stack, left to right\n" + _stack(study),
        _window(study) + "\n" + _levels(study) + _proof(study),
        "Transmission\n" + _transmission(study),
        "Current\n" + (no_current if sweep is None else sweep_text(sweep)),
        "Notes\n" + _notes(study),
    ]
    return "\n\n".join(part.rstrip("\n") for part in parts) + "\n"


def _heading(study: Study, source: str) -> str:
    session, structure = study.scene.request.session, study.scene.structure
    conditions = session.conditions
    lines = [session.title or "(no title)", f"from {source}"]
    if session.notes.strip():
        lines += [f"  {line}" for line in session.notes.strip().splitlines()]
    lines.append(
        f"{conditions.temperature_K:g} K, bias {conditions.bias_V:g} V, {conditions.field} field; "
        f"built-in {1e3 * built_in_eV(structure):.3f} meV; "
        f"{len(structure.layers)} layers, {structure.thickness_nm:.4f} nm"
    )
    return "\n".join(lines)


def _stack(study: Study) -> str:
    structure, profile = study.scene.structure, study.profile
    rows = [_contact_row("L", structure.left, profile.contact_edge_eV[0])]
    for n, layer in enumerate(structure.layers):
        left, right = profile.layer_edges_eV(n)
        rows.append(_layer_row(n + 1, layer, left, right))
    rows.append(_contact_row("R", structure.right, profile.contact_edge_eV[1]))
    return columns(STACK_HEAD, rows, left_aligned=(1, 2))


def _contact_row(side: str, contact: Contact, biased_eV: float) -> list[str]:
    fermi = "" if contact.fermi_eV is None else f"Fermi {1e3 * contact.fermi_eV:+.2f} meV"
    donors = "" if contact.donors_cm3 is None else f"{contact.donors_cm3:.3g}"
    edge, mass = f"{contact.edge_eV:.4f}", f"{contact.mass:.4f}"
    return [side, fermi, contact.name, "", "", edge, mass, donors, f"{biased_eV:.4f}"]


def _layer_row(number: int, layer: Layer, left_eV: float, right_eV: float) -> list[str]:
    monolayers = "" if not layer.monolayer_nm else f"{layer.thickness_nm / layer.monolayer_nm:.2f}"
    edge = f"{layer.edge_eV:.4f}"
    if layer.to_edge_eV is not None:
        edge += f" to {layer.to_edge_eV:.4f}"
    mass = f"{layer.mass:.4f}" + ("" if layer.to_mass is None else f" to {layer.to_mass:.4f}")
    biased = f"{left_eV:.4f}" if left_eV == right_eV else f"{left_eV:.4f} to {right_eV:.4f}"
    donors = "" if layer.donors_cm3 == 0.0 else f"{layer.donors_cm3:.3g}"
    nm = f"{layer.thickness_nm:.4f}"
    return [str(number), layer.label, layer.name, nm, monolayers, edge, mass, donors, biased]


def _window(study: Study) -> str:
    scene = study.scene
    width = quantities.energy(scene.max_width_eV)
    return f"Levels from {scene.from_eV:.4f} to {scene.to_eV:.4f} eV, up to {width} wide"


def _levels(study: Study) -> str:
    rows = [
        level_row(number, level, study.scene.structure.layers)
        for number, level in enumerate(study.levels.levels, start=1)
    ]
    return columns(LEVEL_HEAD, rows, left_aligned=(8,)) if rows else "none\n"


def level_row(number: int, level: Level, layers: Sequence[Layer]) -> list[str]:
    """Write one level's row of the table under `LEVEL_HEAD`."""
    at, share = main_layer(level.share_by_layer)
    label = layers[at - 1].label or layers[at - 1].name
    place = f"layer {at}" + (f" {label}" if label else "") + f", {100.0 * share:.0f} %"
    return [
        str(number),
        f"{1e3 * level.energy_eV:.5f}",
        quantities.width(level.width_eV, level.log10_width_eV),
        quantities.duration(level.lifetime_s),
        quantities.energy(level.left_width_eV),
        quantities.energy(level.right_width_eV),
        f"{level.peak_transmission:.4g}",
        str(level.nodes),
        place,
    ]


def _proof(study: Study) -> str:
    levels = study.levels
    if not levels.complete:
        return f"{len(levels.levels)} found; the count could not be proved, some may be missing\n"
    return f"{len(levels.levels)} found, {levels.counted} counted: complete\n"


def _transmission(study: Study) -> str:
    spectrum = study.spectrum
    wanted = np.linspace(study.scene.from_eV, study.scene.to_eV, SAMPLES)
    at = np.unique(np.abs(spectrum.energy_eV[:, None] - wanted).argmin(axis=0))
    rows = [
        [
            f"{spectrum.energy_eV[n]:.5f}",
            quantities.probability(
                float(spectrum.transmission[n]), float(spectrum.log10_transmission[n])
            ),
            quantities.duration(float(spectrum.dwell_time_s[n])),
        ]
        for n in at
    ]
    return columns(("energy eV", "T", "dwell time"), rows, left_aligned=())


def _notes(study: Study) -> str:
    return "".join(f"- {note.topic}: {note.text}\n" for note in study.advice) or "none\n"
