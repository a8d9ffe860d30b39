"""What growth leaves to chance, drawn on a structure.

Each source of error is a set of independent standard normal variables: one a material for the
growth rate, one a layer for the thickness, one an alloy (and mixed sublattice) for the composition,
one a doped part for the donors, and one for the grading of all interfaces, whose width is half
normal. `drawn` takes one value for each of them and gives the structure that was grown.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache

from physics.alloy_errors import Makeup, Shifts, with_alloys
from physics.errors import StructureError
from physics.formula import parse_formula
from physics.grading import graded, unlike_faces
from physics.occupation import fermi_from_donors
from physics.structure import Contact, Layer, Structure

SOURCES = ("rate", "thickness", "composition", "donors", "grading")
LEAST_NM = 1e-3
"""A layer that a draw would make thinner stays this thick: all but not grown."""
LEAST_SHARE = 0.01
"""Donors stay above this share of what was asked for."""
HALF_NORMAL = math.sqrt(0.5 * math.pi)
"""Mean of the width |z| over the standard deviation of z, turned round."""
NEEDS_MONOLAYER = "state the thickness error in nm, as thickness_nm: a layer knows no monolayer"


@dataclass(frozen=True)
class Deviations:
    """Standard deviations; 0 where nothing is left to chance."""

    rate: float = 0.0
    """Of the growth rate, as a share of it."""
    thickness_nm: float = 0.0
    thickness_ml: float = 0.0
    """Of the thickness, in monolayers of the layer."""
    composition: float = 0.0
    """Of an alloy's fraction."""
    donors: float = 0.0
    """Of the donors, as a share of them."""
    grading_nm: float = 0.0
    """Mean width of the grades, not a standard deviation."""


@dataclass(frozen=True)
class Variable:
    """One standard normal variable."""

    source: str
    """One of `SOURCES`."""
    name: str
    """For the reader: ``rate GaAs``, ``thickness layer 2``."""
    parts: tuple[int, ...] = ()
    """What it acts on: 0 the left contact, then the layers, last the right contact."""
    formula: str = ""
    sublattice: int = 0
    """Of a composition: 0 for group III, 1 for group V."""


@dataclass(frozen=True)
class GrowthErrors:
    """A structure and what growth leaves to chance in it."""

    structure: Structure
    deviations: Deviations
    makeup: Makeup
    temperature_K: float
    variables: tuple[Variable, ...]
    faces: tuple[int, ...] = ()
    """Faces that are graded; none without a grading error."""


def growth_errors(
    structure: Structure, deviations: Deviations, makeup: Makeup, temperature_K: float
) -> GrowthErrors:
    """Find the variables of a structure's errors.

    Parameters
    ----------
    temperature_K : float
        Lattice temperature, at which the contacts' Fermi energies follow their donors.

    Raises
    ------
    StructureError
        Thickness errors are in monolayers and a layer knows none.
    """
    found: list[Variable] = []
    if deviations.rate > 0.0:
        found += _rates(structure)
    if deviations.thickness_nm > 0.0 or deviations.thickness_ml > 0.0:
        found += _thicknesses(structure, deviations)
    if deviations.composition > 0.0:
        found += _compositions(makeup)
    if deviations.donors > 0.0:
        found += _donors(structure)
    faces = unlike_faces(structure) if deviations.grading_nm > 0.0 else ()
    if faces:
        found.append(Variable("grading", "grading"))
    return GrowthErrors(structure, deviations, makeup, temperature_K, tuple(found), faces)


def _rates(structure: Structure) -> list[Variable]:
    """One a material; layers stated in numbers are of one material where the numbers are."""
    groups: dict[tuple[object, ...], list[int]] = {}
    for part, layer in enumerate(structure.layers, start=1):
        unnamed = (layer.edge_eV, layer.mass, layer.right_edge_eV, layer.right_mass)
        groups.setdefault((layer.name,) if layer.name else unnamed, []).append(part)
    return [
        Variable("rate", f"rate {structure.layers[parts[0] - 1].name or _listed(parts)}", (*parts,))
        for parts in groups.values()
    ]


def _listed(parts: list[int]) -> str:
    return f"layer {','.join(map(str, parts))}"


def _thicknesses(structure: Structure, deviations: Deviations) -> list[Variable]:
    for part, layer in enumerate(structure.layers, start=1):
        if deviations.thickness_ml > 0.0 and layer.monolayer_nm is None:
            raise StructureError(f"layer {part}", "monolayer_nm", None, NEEDS_MONOLAYER)
    parts = range(1, len(structure.layers) + 1)
    return [Variable("thickness", f"thickness layer {part}", (part,)) for part in parts]


def _compositions(makeup: Makeup) -> list[Variable]:
    named = [makeup.left, *(name for pair in makeup.layers for name in pair), makeup.right]
    found: dict[tuple[str, int], Variable] = {}
    for formula in named:
        if formula is None:
            continue
        alloy = parse_formula(formula)
        for sublattice, fractions in enumerate((alloy.cations, alloy.anions)):
            if len(fractions) > 1:
                text = f"composition {alloy.name}"
                text += " group V" if sublattice and len(alloy.cations) > 1 else ""
                key = (alloy.name, sublattice)
                found[key] = Variable("composition", text, (), *key)
    return list(found.values())


def _donors(structure: Structure) -> list[Variable]:
    parts: tuple[Contact | Layer, ...] = (structure.left, *structure.layers, structure.right)
    names = ["left", *(f"layer {n}" for n in range(1, len(parts) - 1)), "right"]
    return [
        Variable("donors", f"donors {name}", (n,))
        for n, (name, part) in enumerate(zip(names, parts, strict=True))
        if part.donors_cm3
    ]


def drawn(errors: GrowthErrors, draw: Sequence[float]) -> Structure:
    """Give the structure that one draw makes.

    Parameters
    ----------
    draw : sequence of float, shape (K,)
        A standard normal value for each variable; 0: as designed.

    Raises
    ------
    StructureError, MaterialError
        The draw makes something that is no structure, or an alloy without a gap.
    """
    structure, size = errors.structure, errors.deviations
    thickness = _drawn_thicknesses(errors, draw)
    donors: dict[int, float] = {}
    shifts: Shifts = {}
    width = 0.0
    for variable, value in zip(errors.variables, draw, strict=True):
        match variable.source:
            case "composition":
                shift = (variable.sublattice, size.composition * value)
                shifts.setdefault(variable.formula, []).append(shift)
            case "donors":
                donors[variable.parts[0]] = max(1.0 + size.donors * value, LEAST_SHARE)
            case "grading":
                width = size.grading_nm * HALF_NORMAL * abs(value)
    made = _with_numbers(structure, thickness, donors)
    if any(shift for parts in shifts.values() for _, shift in parts):
        made = with_alloys(made, errors.makeup, shifts)
    made = _with_fermi(made, structure, errors.temperature_K)
    return graded(made, width, errors.faces) if errors.faces else made


def _drawn_thicknesses(errors: GrowthErrors, draw: Sequence[float]) -> list[float]:
    """Thickness of every layer in nm, which a rate's drift and the layer's own error change."""
    layers, size = errors.structure.layers, errors.deviations
    thickness = [layer.thickness_nm for layer in layers]
    for variable, value in zip(errors.variables, draw, strict=True):
        if variable.source not in ("rate", "thickness"):
            continue
        for part in variable.parts:
            layer = layers[part - 1]
            unit = size.thickness_nm + size.thickness_ml * (layer.monolayer_nm or 0.0)
            unit = layer.thickness_nm * size.rate if variable.source == "rate" else unit
            thickness[part - 1] += unit * value
    return thickness


def _with_numbers(
    structure: Structure, thickness: list[float], donors: dict[int, float]
) -> Structure:
    layers = tuple(
        replace(
            layer,
            thickness_nm=max(thickness[n], LEAST_NM),
            donors_cm3=layer.donors_cm3 * donors.get(n + 1, 1.0),
        )
        for n, layer in enumerate(structure.layers)
    )
    left, right = (
        part if part.donors_cm3 is None else replace(part, donors_cm3=part.donors_cm3 * share)
        for part, share in (
            (structure.left, donors.get(0, 1.0)),
            (structure.right, donors.get(len(layers) + 1, 1.0)),
        )
    )
    return replace(structure, left=left, layers=layers, right=right)


@lru_cache(maxsize=65_536)
def _known_fermi(donors_cm3: float, mass: float, temperature_K: float) -> float:
    # One set of draws comes again for each source that is switched off.
    return fermi_from_donors(donors_cm3, mass, temperature_K)


def _with_fermi(made: Structure, designed: Structure, temperature_K: float) -> Structure:
    """Let the Fermi energies follow donors and masses; a stated Fermi energy stays."""
    contacts: list[Contact] = []
    for new, old in ((made.left, designed.left), (made.right, designed.right)):
        contact = new
        if new.donors_cm3 and (new.donors_cm3, new.mass) != (old.donors_cm3, old.mass):
            fermi = _known_fermi(new.donors_cm3, new.mass, temperature_K)
            contact = replace(new, fermi_eV=fermi)
        contacts.append(contact)
    return replace(made, left=contacts[0], right=contacts[1])
