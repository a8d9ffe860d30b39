"""Interfaces graded over a width: each one split into linear grades of edge, mass and gap.

The grade is centred on the interface, half of it in either part. Edge, mass and gap go linearly,
which for an alloy is a linear composition but for its bowing. A layer gives at most `MOST_SHARE` of
its thickness to either side, so that the grades of a thin layer do not meet.
"""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

from physics.structure import Contact, Layer, Structure

MOST_SHARE = 0.45
LEAST_NM = 1e-5
"""Grades narrower than this stay this wide, so that structures of one family have like layers."""
SAME_EV = 1e-9
"""Edges closer than this, of like masses, make no interface."""

Values = tuple[float, float, float | None]
"""Edge in eV, mass in m0, gap in eV."""


def unlike_faces(structure: Structure) -> tuple[int, ...]:
    """Give the faces at which edge or mass jump, counted from 0 at the left contact's face."""
    parts = _parts(structure)
    found = []
    for face, (left, right) in enumerate(pairwise(parts)):
        (edge, mass, _), (to_edge, to_mass, _) = _right_end(left), _left_end(right)
        if abs(edge - to_edge) > SAME_EV or mass != to_mass:
            found.append(face)
    return tuple(found)


def graded(structure: Structure, width_nm: float, faces: tuple[int, ...]) -> Structure:
    """Split faces of a structure into linear grades.

    Parameters
    ----------
    width_nm : float
        Full width of every grade.
    faces : tuple of int
        The faces that are graded, as `unlike_faces` counts them.

    Returns
    -------
    Structure
        With one more layer for each side of a graded face; its layers are counted otherwise.

    Raises
    ------
    StructureError
        What comes out is no structure, as `Structure` says.
    """
    parts = _parts(structure)
    reach = [_reach_nm(part, 0.5 * width_nm) for part in parts]
    layers: list[Layer] = []
    for index, part in enumerate(parts):
        before, after = index - 1 in faces, index in faces
        if before:
            layers.append(_grade(parts, reach, index, is_left=True))
        if isinstance(part, Layer):
            layers.append(_core(part, reach[index] * before, reach[index] * after))
        if after:
            layers.append(_grade(parts, reach, index, is_left=False))
    return replace(structure, layers=tuple(layers))


def _parts(structure: Structure) -> tuple[Contact | Layer, ...]:
    return (structure.left, *structure.layers, structure.right)


def _reach_nm(part: Contact | Layer, half_nm: float) -> float:
    most = MOST_SHARE * part.thickness_nm if isinstance(part, Layer) else half_nm
    return max(min(half_nm, most), LEAST_NM)


def _grade(
    parts: tuple[Contact | Layer, ...], reach: list[float], index: int, *, is_left: bool
) -> Layer:
    """Make the piece of a part next to its left or right face."""
    part, width = parts[index], reach[index]
    first = index - 1 if is_left else index
    share = reach[first] / (reach[first] + reach[first + 1])
    middle = _between(_right_end(parts[first]), _left_end(parts[first + 1]), share)
    if isinstance(part, Contact):
        own = Layer(width, part.edge_eV, part.mass, None, None, part.permittivity)
        own = replace(own, donors_cm3=part.donors_cm3 or 0.0, name=part.name, gap_eV=part.gap_eV)
        inner = _left_end(part)
    else:
        own = part
        within = width / part.thickness_nm
        inner = _between(_left_end(part), _right_end(part), within if is_left else 1.0 - within)
    return _piece(own, width, *((middle, inner) if is_left else (inner, middle)))


def _core(layer: Layer, left_nm: float, right_nm: float) -> Layer:
    """Give what is left of a layer between its grades."""
    rest = layer.thickness_nm - left_nm - right_nm
    if layer.to_edge_eV is None and layer.to_mass is None and layer.to_gap_eV is None:
        return replace(layer, thickness_nm=rest)
    ends = _left_end(layer), _right_end(layer)
    first = _between(*ends, left_nm / layer.thickness_nm)
    return _piece(layer, rest, first, _between(*ends, 1.0 - right_nm / layer.thickness_nm))


def _piece(layer: Layer, thickness_nm: float, first: Values, last: Values) -> Layer:
    return replace(
        layer,
        thickness_nm=thickness_nm,
        edge_eV=first[0],
        mass=first[1],
        gap_eV=first[2],
        to_edge_eV=last[0],
        to_mass=last[1],
        to_gap_eV=last[2],
    )


def _left_end(part: Contact | Layer) -> Values:
    return part.edge_eV, part.mass, part.gap_eV


def _right_end(part: Contact | Layer) -> Values:
    if isinstance(part, Contact):
        return _left_end(part)
    return part.right_edge_eV, part.right_mass, part.right_gap_eV


def _between(first: Values, last: Values, share: float) -> Values:
    gap = None
    if first[2] is not None and last[2] is not None:
        gap = first[2] + (last[2] - first[2]) * share
    return (
        first[0] + (last[0] - first[0]) * share,
        first[1] + (last[1] - first[1]) * share,
        gap,
    )
