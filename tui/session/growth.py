"""Materials of the catalogue as they are on the session's substrate.

Without a substrate they are unstrained. What the user states in numbers never comes here.
"""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache

from physics.errors import MaterialError
from physics.materials import Material, material
from physics.strain import (
    Kinks,
    Strain,
    critical_thickness_nm,
    poisson_ratio,
    strain_on,
    strained,
)
from physics.structure import Contact, Layer, Structure
from tui.session.lines import KeyPath
from tui.session.model import Session
from tui.session.refusal import SessionError, named, printable, shown

SUBSTRATE_PATH: KeyPath = ("growth", "substrate")


def substrate_of(session: Session) -> str | None:
    """Give the substrate's formula, once it is known to be one; None where none is named.

    Raises
    ------
    SessionError
        It is no formula of the catalogue.
    """
    name = session.growth.substrate
    if name is None:
        return None
    if any(entry.name == name for entry in session.materials):
        allowed = "a material of one's own has no lattice constant; name a formula, as InP"
        raise refused(SUBSTRATE_PATH, name, allowed)
    remedy = "name the substrate by its formula, as InP"
    _unstrained(name, session.conditions.temperature_K, SUBSTRATE_PATH, remedy)
    return name


def grown(name: str, temperature_K: float, substrate: str | None, path: KeyPath) -> Material:
    """Look a material up in the catalogue, strained where there is a substrate."""
    known = _unstrained(name, temperature_K, path, "or define [material.NAME]")
    if substrate is None:
        return known
    try:
        return _known_strained(name, substrate, temperature_K)
    except MaterialError as error:
        why = str(error).removeprefix(f"material {known.name!r}: ")
        raise refused(path, name, why) from error


def layer_on(
    layer: Layer, substrate: str, temperature_K: float, name: str, to_name: str | None
) -> Layer:
    """Say in a layer of the catalogue how it is strained.

    Parameters
    ----------
    layer : Layer
        With its edges already strained.
    substrate : str
        Formula.
    temperature_K : float
        Lattice temperature.
    name, to_name : str
        Formulas at the left face and, where it differs and is in the catalogue, at the right one.
    """
    strain = _known_strain(name, substrate, temperature_K)
    end = None if to_name is None else _known_strain(to_name, substrate, temperature_K).in_plane
    mean = strain.in_plane if end is None else 0.5 * (strain.in_plane + end)
    return replace(
        layer,
        strain=strain.in_plane,
        to_strain=end,
        edge_shift_eV=strain.edge_shift_eV,
        critical_nm=_critical_nm(mean, name, temperature_K, 2),
    )


def contact_on(contact: Contact, substrate: str, temperature_K: float, name: str) -> Contact:
    """Say in a contact of the catalogue how it is strained."""
    strain = _known_strain(name, substrate, temperature_K)
    return replace(
        contact,
        strain=strain.in_plane,
        edge_shift_eV=strain.edge_shift_eV,
        critical_nm=_critical_nm(strain.in_plane, name, temperature_K, 1),
    )


def stack_on(structure: Structure, substrate: str, temperature_K: float) -> Structure:
    """Name the substrate in a structure, with the critical thickness of the stack as a whole."""
    critical = _critical_nm(structure.mean_strain, substrate, temperature_K, 2)
    name = _known(substrate, temperature_K).name
    return replace(structure, substrate=name, critical_nm=critical)


def refused(path: KeyPath, value: object, allowed: str) -> SessionError:
    """Refuse a value that stands at a path."""
    return SessionError(said(path), f"is {shown(value)}", printable(allowed), path=path)


def said(path: KeyPath) -> str:
    """Say a path as a reader counts: layers from 1."""
    return " ".join(str(part + 1) if isinstance(part, int) else named(part) for part in path)


@lru_cache(maxsize=1024)
def _known(name: str, temperature_K: float) -> Material:
    # A stack names few materials many times, and looking one up is pure.
    return material(name, temperature_K)


@lru_cache(maxsize=1024)
def _known_strain(name: str, substrate: str, temperature_K: float) -> Strain:
    return strain_on(_known(name, temperature_K), _known(substrate, temperature_K))


@lru_cache(maxsize=1024)
def _known_strained(name: str, substrate: str, temperature_K: float) -> Material:
    strain = _known_strain(name, substrate, temperature_K)
    return strained(_known(name, temperature_K), strain)


def _unstrained(name: str, temperature_K: float, path: KeyPath, remedy: str) -> Material:
    try:
        return _known(name, temperature_K)
    except MaterialError as error:
        why = str(error).removeprefix(f"material {name!r}: ")  # the refusal has named it already
        raise refused(path, name, f"{why}; {remedy}") from error


@lru_cache(maxsize=1024)
def _critical_nm(in_plane: float, name: str, temperature_K: float, kinks: Kinks) -> float | None:
    """Critical thickness as a structure holds it: None without strain, 0 where there is none."""
    known = _known(name, temperature_K)
    if in_plane == 0.0 or known.elastic is None or known.lattice_nm is None:
        return None
    poisson = poisson_ratio(known.elastic)
    return critical_thickness_nm(in_plane, known.lattice_nm, poisson, kinks) or 0.0
