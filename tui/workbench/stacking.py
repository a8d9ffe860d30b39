"""Layers added, copied, moved, split, turned and mirrored. From one session to the next."""

from __future__ import annotations

from dataclasses import replace

from physics.structure import Layer, Structure
from tui.session.model import ContactEntry, LayerEntry, Session
from tui.workbench.typed import Refusal
from tui.workbench.values import explicit, short, with_entry

NEW_THICKNESS_NM = 3.0


def add_layer(session: Session, after: int) -> Session:
    """Add a layer behind the one given (-1: in front of all), like it or like the left contact."""
    source = session.layers[after] if after >= 0 else None
    medium: LayerEntry | ContactEntry = session.left if source is None else source
    fresh = LayerEntry(
        material=medium.material,
        edge_eV=medium.edge_eV,
        mass=medium.mass,
        permittivity=medium.permittivity,
        gap_eV=medium.gap_eV,
        thickness_nm=NEW_THICKNESS_NM,
    )
    return _with(session, (*session.layers[: after + 1], fresh, *session.layers[after + 1 :]))


def duplicate_layer(session: Session, at: int) -> Session:
    """Put a copy behind a layer."""
    layers = session.layers
    return _with(session, (*layers[: at + 1], layers[at], *layers[at + 1 :]))


def delete_layer(session: Session, at: int) -> Session:
    """Take a layer out.

    Raises
    ------
    Refusal
        It is the last one.
    """
    if len(session.layers) == 1:
        raise Refusal("a stack has at least one layer")
    return _with(session, (*session.layers[:at], *session.layers[at + 1 :]))


def move_layer(session: Session, at: int, by: int) -> Session:
    """Exchange a layer with its neighbour.

    Raises
    ------
    Refusal
        There is none on that side.
    """
    to = at + by
    if not 0 <= to < len(session.layers):
        raise Refusal("the layer is at the end of the stack")
    layers = list(session.layers)
    layers[at], layers[to] = layers[to], layers[at]
    return _with(session, tuple(layers))


def split_layer(session: Session, at: int, structure: Structure | None) -> Session:
    """Cut a layer into two halves; of a grade each half keeps its part.

    Raises
    ------
    Refusal
        The layer is graded between materials and not resolved yet.
    """
    layer = session.layers[at]
    half = replace(
        layer,
        thickness_nm=None if layer.thickness_nm is None else 0.5 * layer.thickness_nm,
        thickness_ml=None if layer.thickness_ml is None else 0.5 * layer.thickness_ml,
    )
    first = second = half
    if _is_graded(layer):
        if structure is None:
            raise Refusal("the layer's grade is not known yet; mend the design first")
        first, second = _halves(half, structure.layers[at])
    return _with(session, (*session.layers[:at], first, second, *session.layers[at + 1 :]))


def turn_layer(session: Session, at: int, structure: Structure | None) -> Session:
    """Turn a graded layer round.

    Raises
    ------
    Refusal
        It is not graded, or not resolved yet.
    """
    layer = session.layers[at]
    if not _is_graded(layer):
        raise Refusal("the layer has no grade to turn")
    return with_entry(session, ("layer", at), _turned(layer, at, structure))


def mirror(session: Session, about: int, structure: Structure | None) -> Session:
    """Make the stack symmetric: what is left of a layer is repeated, mirrored, on its right.

    Raises
    ------
    Refusal
        The layer is graded, so that it has no middle to mirror at; or a grade on its left is not
        resolved yet.
    """
    if _is_graded(session.layers[about]):
        raise Refusal("a graded layer is not symmetric itself; put the cursor on one without grade")
    before = [_turned(layer, n, structure) for n, layer in enumerate(session.layers[:about])]
    return _with(session, (*session.layers[: about + 1], *reversed(before)))


def _with(session: Session, layers: tuple[LayerEntry, ...]) -> Session:
    return replace(session, layers=layers)


def _is_graded(layer: LayerEntry) -> bool:
    ends = (layer.to_material, layer.to_edge_eV, layer.to_mass, layer.to_gap_eV)
    return any(end is not None for end in ends)


def _turned(layer: LayerEntry, at: int, structure: Structure | None) -> LayerEntry:
    if not _is_graded(layer):
        return layer
    if structure is None:
        raise Refusal("the layer's grade is not known yet; mend the design first")
    part = structure.layers[at]
    if layer.material is not None and layer.to_material is not None:
        turned = replace(
            layer,
            material=layer.to_material,
            to_material=layer.material,
            gap_eV=layer.to_gap_eV,
            to_gap_eV=layer.gap_eV,
        )
        if layer.thickness_ml is None:
            return turned
        # The other material's monolayer differs; the thickness is to stay.
        return replace(turned, thickness_ml=None, thickness_nm=short(part.thickness_nm))
    changes = explicit(layer, ("layer", at), structure)
    changes |= {
        "material": None,
        "to_material": None,
        "edge_eV": short(part.right_edge_eV),
        "mass": short(part.right_mass),
        "to_edge_eV": short(part.edge_eV),
        "to_mass": short(part.mass),
        "gap_eV": _short_or_none(part.right_gap_eV),
        "to_gap_eV": _short_or_none(part.gap_eV),
    }
    return replace(layer, **changes)


def _halves(half: LayerEntry, part: Layer) -> tuple[LayerEntry, LayerEntry]:
    """Two halves of a graded layer, said in numbers."""
    edge = short(0.5 * (part.edge_eV + part.right_edge_eV))
    mass = short(0.5 * (part.mass + part.right_mass))
    thickness = short(0.5 * part.thickness_nm)
    plain = replace(
        half,
        material=None,
        to_material=None,
        thickness_nm=thickness,
        thickness_ml=None,
        permittivity=part.permittivity,
    )
    gap = _middle_gap_eV(part)
    first = replace(
        plain,
        edge_eV=short(part.edge_eV),
        mass=part.mass,
        gap_eV=part.gap_eV,
        to_edge_eV=edge,
        to_mass=mass,
        to_gap_eV=gap,
    )
    second = replace(
        plain,
        edge_eV=edge,
        mass=mass,
        gap_eV=gap,
        to_edge_eV=short(part.right_edge_eV),
        to_mass=part.right_mass,
        to_gap_eV=part.right_gap_eV,
    )
    return first, second


def _middle_gap_eV(part: Layer) -> float | None:
    """Gap in the middle of a grade: mass over gap goes linearly from face to face."""
    if part.gap_eV is None or part.right_gap_eV is None:
        return None
    slope = 0.5 * (part.mass / part.gap_eV + part.right_mass / part.right_gap_eV)
    return short(0.5 * (part.mass + part.right_mass) / slope)


def _short_or_none(value: float | None) -> float | None:
    return None if value is None else short(value)
