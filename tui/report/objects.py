"""Results as JSON: one object with schema, command, conditions and the command's keys.

A number that cannot be said is null, never NaN.
"""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Iterator
from dataclasses import asdict
from typing import Any

from physics.advice import Advice
from physics.levels import Level, LevelSet
from physics.scattering import Scattering
from physics.structure import Contact, Layer
from physics.wavefunction import Density
from tui.report.tables import PROFILE, SPECTRUM, main_layer
from tui.session.model import Session
from tui.study import Study

SCHEMA = 1

Object = dict[str, Any]


def document(command: str, session: Session, content: Object) -> str:
    """Write a command's result."""
    head: Object = {
        "schema": SCHEMA,
        "command": command,
        "title": session.title,
        "conditions": asdict(session.conditions),
    }
    return json.dumps(_sayable(head | content), indent=1, allow_nan=False) + "\n"


def spectrum_object(spectrum: Scattering) -> Object:
    """T and R over energy, as lists."""
    return {name: getattr(spectrum, name).tolist() for name in SPECTRUM}


def spectrum_document_parts(
    command: str, session: Session, spectra: Iterable[Scattering]
) -> Iterator[str]:
    """Write what `document` writes of `spectrum_object`, part by part.

    A list comes after the other, so that the columns are held, though not their text.
    """
    parts = [{name: getattr(spectrum, name) for name in SPECTRUM} for spectrum in spectra]
    yield document(command, session, {}).removesuffix("\n}\n")
    for name in SPECTRUM:
        yield f',\n "{name}": ['
        for number, part in enumerate(parts):
            values = _sayable(part[name].tolist())
            words = ",\n  ".join("null" if value is None else repr(value) for value in values)
            yield (",\n  " if number else "\n  ") + words
        yield "\n ]"
    yield "\n}\n"


def levels_object(levels: LevelSet) -> Object:
    """Every level, the window, and what was proved."""
    return {
        "levels": [_level(level, number) for number, level in enumerate(levels.levels, start=1)],
        "complete": levels.complete,
        "counted": levels.counted,
        "accurate": levels.accurate,
        "from_eV": levels.from_eV,
        "to_eV": levels.to_eV,
        "max_width_eV": levels.max_width_eV,
    }


def profile_object(density: Density, level: int | None) -> Object:
    """Band edge and density over position."""
    result: Object = {name: getattr(density, name).tolist() for name in PROFILE}
    return result | {"norm": density.norm, "energy_eV": density.energy_eV, "level": level}


def advice_object(advice: tuple[Advice, ...]) -> Object:
    """Give the notes that go with an answer."""
    return {"advice": [asdict(note) for note in advice]}


def report_object(study: Study) -> Object:
    """Give the whole answer."""
    structure, profile = study.scene.structure, study.profile
    layers = [
        _layer(layer, number, *profile.layer_edges_eV(number - 1))
        for number, layer in enumerate(structure.layers, start=1)
    ]
    return {
        "left": _contact(structure.left, profile.contact_edge_eV[0]),
        "layers": layers,
        "right": _contact(structure.right, profile.contact_edge_eV[1]),
        **levels_object(study.levels),
        "spectrum": spectrum_object(study.spectrum),
        **advice_object(study.advice),
    }


def _level(level: Level, number: int) -> Object:
    layer, share = main_layer(level.share_by_layer)
    return {"number": number, **asdict(level), "main_layer": layer, "main_layer_share": share}


def _contact(contact: Contact, biased_edge_eV: float) -> Object:
    return asdict(contact) | {"biased_edge_eV": biased_edge_eV}


def _layer(layer: Layer, number: int, left_eV: float, right_eV: float) -> Object:
    biased = {"biased_left_edge_eV": left_eV, "biased_right_edge_eV": right_eV}
    return {"number": number} | asdict(layer) | biased


def _sayable(value: Any) -> Any:
    """Put null for what JSON cannot say."""
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, dict):
        return {key: _sayable(part) for key, part in value.items()}
    if isinstance(value, (list, tuple)):
        return [_sayable(part) for part in value]
    return value
