"""Values of a session: looked up, typed, stepped. Pure functions from session to session."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from physics.ranges import Range
from physics.structure import Layer, Structure
from tui.session import tables
from tui.session.model import ContactEntry, LayerEntry, Session, View
from tui.session.refusal import has_controls
from tui.workbench.steps import (
    FACTORS,
    FIRST_DONORS_CM3,
    STEPS,
    next_choice,
    stepped_formula,
)
from tui.workbench.typed import Refusal, number, unit_of

Place = tuple[str, int]
"""``("conditions", 0)``, ``("view", 0)``, ``("top", 0)``, ``("left", 0)``, ``("right", 0)`` or
``("layer", n)`` with n from 0."""

AGAINST = {
    "thickness_nm": ("thickness_ml",),
    "thickness_ml": ("thickness_nm",),
    "material": ("edge_eV", "mass", "gap_eV"),
    "to_material": ("to_edge_eV", "to_mass", "to_gap_eV"),
    "to_edge_eV": ("to_material",),
    "to_mass": ("to_material",),
    "donors_cm3": ("fermi_eV",),
    "fermi_eV": ("donors_cm3",),
    "dephasing_eV": ("scattering_time_s", "mobility_cm2_Vs"),
    "scattering_time_s": ("dephasing_eV", "mobility_cm2_Vs"),
    "mobility_cm2_Vs": ("dephasing_eV", "scattering_time_s"),
}
"""Values that a new one stands against, and takes away."""
NEEDED = (
    "thickness_nm",
    "thickness_ml",
    "material",
    "edge_eV",
    "mass",
    "temperature_K",
    "bias_V",
    "field",
    "band",
    "charge",
)
CHOICES = {
    "band": tables.BANDS,
    "field": tables.FIELD_MODELS,
    "charge": tables.CHARGE_MODELS,
}
"""Texts of which there are a few; a step goes to the next."""
EMPTY = {"title": "", "notes": "", "label": "", "max_width_eV": View().max_width_eV}
"""What an emptied field falls back to."""
TABLES: dict[str, tables.Table] = {
    "conditions": tables.CONDITIONS,
    "view": tables.VIEW,
    "growth": tables.GROWTH,
    "sweep": tables.SWEEP,
    "device": tables.DEVICE,
    "top": tables.TOP_TEXTS,
    "left": tables.CONTACT,
    "right": tables.CONTACT,
    "layer": tables.LAYER,
}


def value_of(session: Session, place: Place, key: str) -> Any:
    """Look a value up as the session says it; None where it does not."""
    return getattr(entry_at(session, place), key)


def set_typed(
    session: Session, place: Place, key: str, text: str, structure: Structure | None
) -> Session:
    """Put what was typed into a field; an empty text takes the value away where that is possible.

    Parameters
    ----------
    structure : Structure, optional
        The session resolved, from which a layer of a material takes what it keeps when it is
        given an edge or a mass of its own.

    Raises
    ------
    Refusal
        The text does not fit the field.
    """
    rule = TABLES[place[0]][key]
    stripped = text.strip()
    if isinstance(rule, Range):
        unit = unit_of(key)
        if key in ("thickness_nm", "thickness_ml"):
            key, unit = _thickness_key(key, stripped)
            rule = tables.LAYER[key]
        value = None if not stripped else number(stripped, unit, as_range(rule))
        return set_value(session, place, key, value, structure)
    if has_controls(stripped):
        raise Refusal("control characters cannot be part of a text")
    if key in CHOICES and stripped and stripped not in CHOICES[key]:
        raise Refusal(f"one of these is expected: {', '.join(CHOICES[key])}")
    return set_value(session, place, key, stripped or None, structure)


def set_value(
    session: Session, place: Place, key: str, value: Any, structure: Structure | None = None
) -> Session:
    """Put a value into a field, and take away what it stands against."""
    entry = entry_at(session, place)
    if isinstance(entry, (LayerEntry, ContactEntry)):
        changes = _medium_changes(entry, place, key, value, structure)
    else:
        changes = dict.fromkeys(AGAINST.get(key, ())) | {key: _needed(key, value)}
    return with_entry(session, place, replace(entry, **changes))


def step(
    session: Session,
    place: Place,
    key: str,
    direction: int,
    *,
    fine: bool = False,
    structure: Structure | None = None,
) -> Session:
    """Step a value up or down: a thickness by a monolayer where one is known, else by a unit.

    Raises
    ------
    Refusal
        The field is neither a number nor an alloy, or the step leads out of its range.
    """
    rule = TABLES[place[0]][key]
    if key in ("material", "to_material"):
        formula = value_of(session, place, key) or ""
        by = direction * STEPS["fraction"][fine]
        return set_value(session, place, key, stepped_formula(formula, by), structure)
    if key in CHOICES:
        chosen = next_choice(CHOICES[key], value_of(session, place, key), direction)
        return set_value(session, place, key, chosen, structure)
    if not isinstance(rule, Range):
        raise Refusal("only numbers and alloys can be stepped")
    value = _stated_or_resolved(session, place, key, structure)
    if key in FACTORS:
        factor = FACTORS[key][fine]
        start = FIRST_DONORS_CM3 if value == 0.0 else value
        stepped = start * factor**direction if value else start
    elif key == "thickness_nm" and not fine and (one := _monolayer(place, structure)):
        stepped = value + direction * one
    else:
        stepped = value + direction * STEPS[key][fine]
    stepped = float(f"{stepped:.12g}")
    if not rule.holds(stepped):
        raise Refusal(rule.allowed)
    return set_value(session, place, key, stepped, structure)


def entry_at(session: Session, place: Place) -> Any:
    """Find a layer, a contact or another table of a session."""
    kind, index = place
    if kind == "layer":
        return session.layers[index]
    return session if kind == "top" else getattr(session, kind)


def with_entry(session: Session, place: Place, entry: Any) -> Session:
    """Put a layer, a contact or another table in its place."""
    kind, index = place
    if kind == "layer":
        layers = (*session.layers[:index], entry, *session.layers[index + 1 :])
        return replace(session, layers=layers)
    return entry if kind == "top" else replace(session, **{kind: entry})


def as_range(rule: tables.Entry) -> Range:
    """Give a number's range."""
    if not isinstance(rule, Range):
        raise TypeError(rule)
    return rule


def _thickness_key(key: str, text: str) -> tuple[str, str]:
    """Let ``11 ml`` in the nm field mean monolayers, and the other way round."""
    if text.lower().endswith("ml"):
        return "thickness_ml", "ml"
    if text.endswith(("nm", "A")):
        return "thickness_nm", "nm"
    return key, unit_of(key)


def _needed(key: str, value: Any) -> Any:
    """Give a value that cannot be missing, or what stands in for it."""
    if value is None and key in EMPTY:
        return EMPTY[key]
    if value is None and key in NEEDED:
        raise Refusal("a value is needed here")
    return value


def _medium_changes(
    entry: LayerEntry | ContactEntry,
    place: Place,
    key: str,
    value: Any,
    structure: Structure | None,
) -> dict[str, Any]:
    """Find what else changes in a layer or contact when one of its values does."""
    changes: dict[str, Any] = {}
    if key in ("edge_eV", "mass"):
        changes = explicit(entry, place, structure) | {"material": None}
    if key in ("to_edge_eV", "to_mass") and isinstance(entry, LayerEntry) and entry.to_material:
        part = _resolved(place, structure)
        changes["to_gap_eV"] = entry.to_gap_eV if part is None else part.to_gap_eV
    changes |= {other: None for other in AGAINST.get(key, ()) if hasattr(entry, other)}
    if key == "donors_cm3" and isinstance(entry, LayerEntry):
        return changes | {key: value or 0.0}
    return changes | {key: _needed(key, value)}


def explicit(
    entry: LayerEntry | ContactEntry, place: Place, structure: Structure | None
) -> dict[str, Any]:
    """Say in numbers what a material stands for, so that one of them can be changed."""
    if entry.material is None:
        return {}
    part = _resolved(place, structure)
    if part is None:
        raise Refusal("the material's numbers are not known yet; mend the design first")
    changes = {"edge_eV": short(part.edge_eV), "mass": part.mass}
    if entry.permittivity is None:
        changes["permittivity"] = part.permittivity
    if entry.gap_eV is None:
        changes["gap_eV"] = part.gap_eV
    if isinstance(entry, LayerEntry) and isinstance(part, Layer) and entry.thickness_ml is not None:
        changes |= {"thickness_nm": short(part.thickness_nm), "thickness_ml": None}
    return changes


def short(value: float) -> float:
    """Round a derived number to what a text should show."""
    return float(f"{value:.9g}")


def _resolved(place: Place, structure: Structure | None) -> Any:
    if structure is None:
        return None
    kind, index = place
    return structure.layers[index] if kind == "layer" else getattr(structure, kind)


def _stated_or_resolved(
    session: Session, place: Place, key: str, structure: Structure | None
) -> float:
    value = value_of(session, place, key)
    part = _resolved(place, structure) if place[0] in ("left", "right", "layer") else None
    if value is None and part is not None:
        if key == "thickness_ml":
            one = _monolayer(place, structure)
            value = part.thickness_nm / one if one else None
        else:
            value = getattr(part, key)
    if value is None:
        raise Refusal("there is no value to step from; type one")
    return float(value)


def _monolayer(place: Place, structure: Structure | None) -> float | None:
    part = _resolved(place, structure) if place[0] == "layer" else None
    return None if part is None else part.monolayer_nm
