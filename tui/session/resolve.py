"""From a session as written to the numbers that ``physics`` works with.

Every edge in a session is on one scale, whose zero is the left contact's edge. A catalogue material
enters as its edge above the left contact's; where the left contact is no catalogue material that
height is unknown, and the material is refused rather than guessed.

Where the session names a substrate, every catalogue material enters as it is when strained to it,
the left contact with the others; what the user states in numbers is left as stated.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from physics.band import NEEDS_GAP, Band, masses_of
from physics.dephasing import dephasing_eV
from physics.errors import PhysicsError, StructureError
from physics.materials import Material
from physics.occupation import fermi_from_donors
from physics.structure import Contact, Layer, Structure
from tui.session.growth import (
    contact_on,
    grown,
    layer_on,
    refused,
    said,
    stack_on,
    substrate_of,
)
from tui.session.lines import KeyPath
from tui.session.model import ContactEntry, LayerEntry, MaterialEntry, Session
from tui.session.refusal import SessionError, printable, shown

AGREEMENT = 1e-6
"""Relative difference up to which two ways of saying one thing agree."""
GROWTH_TEMPERATURE_K = 300.0
"""Monolayers are counted at room temperature, whatever the conditions are."""


@dataclass(frozen=True)
class Scale:
    """How materials get their edge in one session."""

    own: dict[str, MaterialEntry]
    temperature_K: float
    zero_eV: float | None
    """Catalogue edge of the left contact, strained; None where it is no catalogue material."""
    substrate: str | None = None
    """Formula; None where none is named."""
    band: Band = "parabolic"

    def formula(self, name: str | None) -> str | None:
        """Give a material's name if it is the catalogue's and strained, else None."""
        return None if self.substrate is None or name in self.own else name


def resolve(session: Session) -> Structure:
    """Resolve materials and thicknesses at the session's temperature.

    Raises
    ------
    SessionError
        A material that is not known, or statements that do not fit together; `SessionError.path`
        says where.
    """
    scale = scale_of(session)
    left = _contact(session.left, "left", scale, session.conditions.temperature_K)
    layers = tuple(_layer(entry, n, scale) for n, entry in enumerate(session.layers))
    right = _contact(session.right, "right", scale, session.conditions.temperature_K)
    try:
        structure = Structure(left, layers, right)
        masses_of(structure, session.conditions.band)  # refuses a missing gap
    except StructureError as error:
        raise _from_structure(error) from error
    if scale.substrate is None:
        return structure
    return stack_on(structure, scale.substrate, scale.temperature_K)


def dephasing_of(session: Session, mass: float) -> float:
    """Width in eV by which lost coherence broadens levels; 0 where nothing is stated.

    Parameters
    ----------
    mass : float
        Mass in m0 that goes with a mobility: the left contact's, the substrate's.

    Raises
    ------
    SessionError
        Two statements that disagree, or a mobility that makes no width that can be computed.
    """
    stated = session.conditions
    widths: dict[str, float] = {}
    if stated.dephasing_eV is not None:
        widths["dephasing_eV"] = stated.dephasing_eV
    try:
        if stated.scattering_time_s is not None:
            widths["scattering_time_s"] = dephasing_eV(scattering_time_s=stated.scattering_time_s)
        if stated.mobility_cm2_Vs is not None:
            mobility = stated.mobility_cm2_Vs
            widths["mobility_cm2_Vs"] = dephasing_eV(mobility_cm2_Vs=mobility, mass=mass)
    except StructureError as error:
        raise _from_structure(error) from error
    kept, width = next(iter(widths.items()), ("", 0.0))
    for key, other in widths.items():
        if abs(other - width) > AGREEMENT * max(other, width):
            found = f"makes a width of {other:.9g} eV, but {kept} one of {width:.9g} eV"
            path: KeyPath = ("conditions", key)
            raise SessionError(
                said(path), found, f"keep one of the two, {key} or {kept}", path=path
            )
    return width


def scale_of(session: Session) -> Scale:
    """Find the scale that a session's catalogue materials are on."""
    own = {entry.name: entry for entry in session.materials}
    temperature = session.conditions.temperature_K
    substrate = substrate_of(session)
    name = session.left.material
    if name is None or name in own:
        return Scale(own, temperature, None, substrate, session.conditions.band)
    zero = grown(name, temperature, substrate, ("left", "material")).edge_eV
    return Scale(own, temperature, zero, substrate, session.conditions.band)


def medium_of(name: str, scale: Scale, path: KeyPath) -> Material:
    """Look a material up: the user's own first, then the catalogue's."""
    if name in scale.own:
        entry = scale.own[name]
        return Material(
            name=printable(name),
            edge_eV=entry.edge_eV,
            mass=entry.mass,
            permittivity=entry.permittivity,
            monolayer_nm=entry.monolayer_nm,
            gap_eV=entry.gap_eV,
        )
    known = grown(name, scale.temperature_K, scale.substrate, path)
    if scale.zero_eV is None:
        allowed = (
            "its edge above the left contact is not known; name the left contact's material, "
            "or give edge_eV and mass here"
        )
        raise SessionError(said(path), f"is {shown(name)}", allowed, path=path)
    return _lowered(known, scale.zero_eV)


def _lowered(known: Material, zero_eV: float) -> Material:
    """Bring a catalogue material to the session's scale."""
    x, low = known.x_edge_eV, known.l_edge_eV
    return replace(
        known,
        edge_eV=known.edge_eV - zero_eV,
        x_edge_eV=None if x is None else x - zero_eV,
        l_edge_eV=None if low is None else low - zero_eV,
    )


def thickness_nm(entry: LayerEntry, medium: Material, path: KeyPath) -> float:
    """Thickness of a layer in nm, however it is stated."""
    if entry.thickness_ml is None:
        if entry.thickness_nm is None:
            raise SessionError(
                said(path), "has no thickness", "give thickness_nm or thickness_ml", path=path
            )
        return entry.thickness_nm
    path = (*path, "thickness_ml")
    if medium.monolayer_nm is None:
        allowed = "give thickness_nm, or a material whose monolayer is known"
        raise SessionError(said(path), "has no monolayer to count in", allowed, path=path)
    counted = entry.thickness_ml * medium.monolayer_nm
    _require_agreement(entry.thickness_nm, counted, (*path[:-1], "thickness_nm"), "thickness_ml")
    return counted


def _layer(entry: LayerEntry, index: int, scale: Scale) -> Layer:
    path: KeyPath = ("layer", index)
    medium = _medium(entry.material, entry.edge_eV, entry.mass, scale, path)
    to_edge, to_mass, to_gap = entry.to_edge_eV, entry.to_mass, entry.to_gap_eV
    if entry.to_material is not None:
        end = medium_of(entry.to_material, scale, (*path, "to_material"))
        _require_agreement(to_edge, end.edge_eV, (*path, "to_edge_eV"), "to_material")
        _require_agreement(to_mass, end.mass, (*path, "to_mass"), "to_material")
        to_edge, to_mass = end.edge_eV, end.mass
        to_gap = end.gap_eV if to_gap is None else to_gap
        if to_gap is None and scale.band == "kane":
            key = (*path, "to_gap_eV")
            raise SessionError(said(key), "is missing", NEEDS_GAP, path=key)
    stated = medium.permittivity if entry.permittivity is None else entry.permittivity
    layer = Layer(
        thickness_nm=thickness_nm(entry, medium, path),
        edge_eV=medium.edge_eV,
        mass=medium.mass,
        to_edge_eV=to_edge,
        to_mass=to_mass,
        permittivity=stated,
        donors_cm3=entry.donors_cm3,
        label=entry.label,
        name=medium.name,
        lattice_nm=medium.lattice_nm,
        monolayer_nm=medium.monolayer_nm,
        x_edge_eV=medium.x_edge_eV,
        l_edge_eV=medium.l_edge_eV,
        gap_eV=medium.gap_eV if entry.gap_eV is None else entry.gap_eV,
        to_gap_eV=to_gap,
    )
    name = scale.formula(entry.material)
    if scale.substrate is None or name is None:
        return layer
    to_name = scale.formula(entry.to_material)
    return layer_on(layer, scale.substrate, scale.temperature_K, name, to_name)


def _contact(entry: ContactEntry, side: str, scale: Scale, temperature_K: float) -> Contact:
    path: KeyPath = (side,)
    medium = _medium(entry.material, entry.edge_eV, entry.mass, scale, path)
    fermi = entry.fermi_eV
    if entry.donors_cm3 is not None:
        try:
            filled = fermi_from_donors(entry.donors_cm3, medium.mass, temperature_K)
        except PhysicsError as error:
            raise refused((*path, "donors_cm3"), entry.donors_cm3, str(error)) from error
        _require_agreement(fermi, filled, (*path, "fermi_eV"), "donors_cm3")
        fermi = filled
    contact = Contact(
        edge_eV=medium.edge_eV,
        mass=medium.mass,
        fermi_eV=fermi,
        name=medium.name,
        donors_cm3=entry.donors_cm3,
        permittivity=medium.permittivity if entry.permittivity is None else entry.permittivity,
        lattice_nm=medium.lattice_nm,
        gap_eV=medium.gap_eV if entry.gap_eV is None else entry.gap_eV,
    )
    name = scale.formula(entry.material)
    if scale.substrate is None or name is None:
        return contact
    return contact_on(contact, scale.substrate, temperature_K, name)


def _medium(
    name: str | None, edge_eV: float | None, mass: float | None, scale: Scale, path: KeyPath
) -> Material:
    if name is None:
        if edge_eV is None or mass is None:
            allowed = "give a material, or edge_eV with mass"
            raise SessionError(said(path), "has no material", allowed, path=path)
        return Material("", edge_eV, mass)
    medium = medium_of(name, scale, (*path, "material"))
    _require_agreement(edge_eV, medium.edge_eV, (*path, "edge_eV"), "material")
    _require_agreement(mass, medium.mass, (*path, "mass"), "material")
    return medium


def _require_agreement(stated: float | None, other: float, path: KeyPath, by: str) -> None:
    if stated is None or abs(stated - other) <= AGREEMENT * max(abs(stated), abs(other)):
        return
    found = f"is {stated:.9g}, but {by} makes it {other:.9g}"  # enough to be copied and to agree
    raise SessionError(said(path), found, f"keep one of the two, {path[-1]} or {by}", path=path)


def _from_structure(error: StructureError) -> SessionError:
    """Say a structure's refusal in the session's terms."""
    words = error.where.split()
    path: KeyPath = (words[0], int(words[1]) - 1) if len(words) > 1 else (words[0],)
    if error.where == "stack":
        path = ("layer",)
    found = "is missing" if error.found is None else f"is {shown(error.found)}"
    key = error.key if error.where == "stack" else f"{error.where} {error.key}"
    return SessionError(key, found, error.allowed, path=(*path, error.key))
