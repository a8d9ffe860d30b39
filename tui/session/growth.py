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


def substrate_of(session: Session) -> Material | None:
    """Look the substrate up; None where the session names none.

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
    return _unstrained(name, session.conditions.temperature_K, SUBSTRATE_PATH, remedy)


def grown(name: str, temperature_K: float, substrate: Material | None, path: KeyPath) -> Material:
    """Look a material up in the catalogue, strained where there is a substrate."""
    known = _unstrained(name, temperature_K, path, "or define [material.NAME]")
    return known if substrate is None else strained(known, _strain(known, substrate, path))


def layer_on(
    layer: Layer, temperature_K: float, substrate: Material, names: tuple[str, str | None]
) -> Layer:
    """Say in a layer of the catalogue how it is strained.

    Parameters
    ----------
    layer : Layer
        With its edges already strained.
    temperature_K : float
        Lattice temperature.
    substrate : Material
        On the catalogue's own scale.
    names : tuple
        Formulas at the left face and, where it differs and is in the catalogue, at the right one.
    """
    name, to_name = names
    known = _known(name, temperature_K)
    strain = _known_strain(known, substrate)
    end = None if to_name is None else _known_strain(_known(to_name, temperature_K), substrate)
    layer = replace(
        layer,
        strain=strain.in_plane,
        to_strain=None if end is None else end.in_plane,
        edge_shift_eV=strain.edge_shift_eV,
    )
    return replace(layer, critical_nm=_critical_nm(layer.mean_strain, known, 2))


def contact_on(contact: Contact, temperature_K: float, substrate: Material, name: str) -> Contact:
    """Say in a contact of the catalogue how it is strained."""
    known = _known(name, temperature_K)
    strain = _known_strain(known, substrate)
    return replace(
        contact,
        strain=strain.in_plane,
        edge_shift_eV=strain.edge_shift_eV,
        critical_nm=_critical_nm(strain.in_plane, known, 1),
    )


def stack_on(structure: Structure, substrate: Material) -> Structure:
    """Name the substrate in a structure, with the critical thickness of the stack as a whole."""
    critical = _critical_nm(structure.mean_strain, substrate, 2)
    return replace(structure, substrate=substrate.name, critical_nm=critical)


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
def _known_strain(layer: Material, substrate: Material) -> Strain:
    return strain_on(layer, substrate)


def _unstrained(name: str, temperature_K: float, path: KeyPath, remedy: str) -> Material:
    try:
        return _known(name, temperature_K)
    except MaterialError as error:
        why = str(error).removeprefix(f"material {name!r}: ")  # the refusal has named it already
        raise refused(path, name, f"{why}; {remedy}") from error


def _strain(known: Material, substrate: Material, path: KeyPath) -> Strain:
    try:
        return _known_strain(known, substrate)
    except MaterialError as error:
        why = str(error).removeprefix(f"material {known.name!r}: ")
        raise refused(path, known.name, why) from error


def _critical_nm(in_plane: float | None, known: Material, kinks: Kinks) -> float | None:
    """Critical thickness as a structure holds it: None without strain, 0 where there is none."""
    if not in_plane or known.elastic is None or known.lattice_nm is None:
        return None
    poisson = poisson_ratio(known.elastic)
    return critical_thickness_nm(in_plane, known.lattice_nm, poisson, kinks) or 0.0
