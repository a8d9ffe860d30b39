"""Alloys whose fractions came out otherwise, and what it does to a structure.

Every part of one formula moves alike: edge, mass, gap and permittivity go by what the catalogue's
law says of the new fractions. The left contact stays the zero of all edges.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import lru_cache

from physics.formula import parse_formula
from physics.materials import Material
from physics.structure import Contact, Layer, Structure

DIGITS = 9
"""Decimals of a fraction that is written into a formula."""

Shifts = dict[str, list[tuple[int, float]]]
"""By formula: sublattice, 0 for group III and 1 for group V, and what its first fraction gains."""


@dataclass(frozen=True)
class Makeup:
    """Which formula of the catalogue each part is; None for what is stated in numbers."""

    left: str | None
    layers: tuple[tuple[str | None, str | None], ...]
    """At the left face and, of a graded layer that names one, at the right face."""
    right: str | None
    look_up: Callable[[str], Material]
    """Gives a formula's material, strained where there is a substrate."""


@dataclass(frozen=True)
class Change:
    """What an alloy's error adds to its numbers."""

    edge_eV: float = 0.0
    mass: float = 0.0
    gap_eV: float = 0.0
    permittivity: float = 0.0


NO_CHANGE = Change()


def with_alloys(structure: Structure, makeup: Makeup, shifts: Shifts) -> Structure:
    """Move every part by what its alloy's error makes of it, on the scale of the left contact."""
    changes: dict[str | None, Change] = {None: NO_CHANGE}
    left = None if makeup.left is None else _change(makeup.left, shifts, makeup.look_up)
    zero = 0.0 if left is None else left.edge_eV
    for formula in {makeup.left, makeup.right, *(n for pair in makeup.layers for n in pair)}:
        if formula is not None:
            change = _change(formula, shifts, makeup.look_up)
            changes[formula] = replace(change, edge_eV=change.edge_eV - zero)
    layers = tuple(
        _moved_layer(layer, changes[name], changes[to_name])
        for layer, (name, to_name) in zip(structure.layers, makeup.layers, strict=True)
    )
    contacts = [
        _moved_contact(contact, changes[name])
        for contact, name in ((structure.left, makeup.left), (structure.right, makeup.right))
    ]
    return replace(structure, left=contacts[0], layers=layers, right=contacts[1])


_parsed = lru_cache(maxsize=256)(parse_formula)


def _change(
    formula: str,
    shifts: Shifts,
    look_up: Callable[[str], Material],
) -> Change:
    name = _parsed(formula).name
    if name not in shifts:
        return NO_CHANGE
    new = name
    for sublattice, shift in shifts[name]:
        new = shifted(new, sublattice, shift)
    before, after = look_up(name), look_up(new)
    return Change(
        after.edge_eV - before.edge_eV,
        after.mass - before.mass,
        (after.gap_eV or 0.0) - (before.gap_eV or 0.0),
        (after.permittivity or 0.0) - (before.permittivity or 0.0),
    )


def shifted(formula: str, sublattice: int, shift: float) -> str:
    """Move a sublattice's first fraction; the others make up for it in proportion.

    The first is the one that comes first of Al, Ga, In or of P, As, Sb; it stays from 0 to 1.
    """
    alloy = _parsed(formula)
    mixed = [list(alloy.cations), list(alloy.anions)]
    (first, share), *others = mixed[sublattice]
    new = min(max(share + shift, 0.0), 1.0)
    factor = (1.0 - new) / (1.0 - share)
    mixed[sublattice] = [(first, new), *((name, part * factor) for name, part in others)]
    return "".join(f"{name}{part:.{DIGITS}f}" for group in mixed for name, part in group)


def _moved_layer(layer: Layer, change: Change, to_change: Change) -> Layer:
    def plus(value: float | None, more: float) -> float | None:
        return None if value is None else value + more

    return replace(
        layer,
        edge_eV=layer.edge_eV + change.edge_eV,
        mass=layer.mass + change.mass,
        to_edge_eV=plus(layer.to_edge_eV, to_change.edge_eV),
        to_mass=plus(layer.to_mass, to_change.mass),
        gap_eV=plus(layer.gap_eV, change.gap_eV),
        to_gap_eV=plus(layer.to_gap_eV, to_change.gap_eV),
        permittivity=plus(layer.permittivity, change.permittivity),
    )


def _moved_contact(contact: Contact, change: Change) -> Contact:
    gap, permittivity = contact.gap_eV, contact.permittivity
    return replace(
        contact,
        edge_eV=contact.edge_eV + change.edge_eV,
        mass=contact.mass + change.mass,
        gap_eV=None if gap is None else gap + change.gap_eV,
        permittivity=None if permittivity is None else permittivity + change.permittivity,
    )
