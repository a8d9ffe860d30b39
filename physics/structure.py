"""What is described: layers between two half-infinite contacts.

Energies are in eV on one common scale (zero at the left contact's band edge unless the left
contact itself states another), lengths in nm, masses in units of the free electron mass. Values
check themselves at birth and never change.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from physics.errors import StructureError

MAX_LAYERS = 20_000
MAX_THICKNESS_NM = 1e5
MAX_EDGE_EV = 100.0
MIN_MASS, MAX_MASS = 1e-4, 100.0
MAX_DONORS_CM3 = 1e22
MAX_PERMITTIVITY = 1e4
MAX_FERMI_EV = 100.0
MIN_TEMPERATURE_K, MAX_TEMPERATURE_K = 0.01, 2000.0
MAX_BIAS_V = 50.0


@dataclass(frozen=True)
class Contact:
    """A half-infinite, flat contact."""

    edge_eV: float
    """Conduction-band edge before any bias."""
    mass: float
    fermi_eV: float | None = None
    """Fermi energy measured from this contact's own band edge; None where it is not known."""
    name: str = ""
    """The material's name, for the reader."""
    donors_cm3: float | None = None
    permittivity: float | None = None
    lattice_nm: float | None = None
    """Lattice constant; the left contact's is taken for the substrate's."""

    def check(self, where: str) -> None:
        """Raise `StructureError` where a value lies outside its range."""
        _require(where, "edge_eV", self.edge_eV, _edge_ok, _EDGE)
        _require(where, "mass", self.mass, _mass_ok, _MASS)
        _require(where, "fermi_eV", self.fermi_eV, _fermi_ok, _FERMI)
        _require(where, "donors_cm3", self.donors_cm3, _donors_ok, _DONORS)
        _require(where, "permittivity", self.permittivity, _permittivity_ok, _PERMITTIVITY)


@dataclass(frozen=True)
class Layer:
    """One layer; with ``to_edge_eV`` or ``to_mass`` a linear grade from left face to right face."""

    thickness_nm: float
    edge_eV: float
    mass: float
    to_edge_eV: float | None = None
    """Band edge at the right face; None: as at the left one."""
    to_mass: float | None = None
    permittivity: float | None = None
    donors_cm3: float = 0.0
    label: str = ""
    name: str = ""
    """The material's name, for the reader."""
    lattice_nm: float | None = None
    monolayer_nm: float | None = None
    x_edge_eV: float | None = None
    """Lowest conduction-band edge at X, on the same scale as ``edge_eV``, where it is known."""
    l_edge_eV: float | None = None

    @property
    def right_edge_eV(self) -> float:
        """Band edge at the right face."""
        return self.edge_eV if self.to_edge_eV is None else self.to_edge_eV

    @property
    def right_mass(self) -> float:
        """Mass at the right face."""
        return self.mass if self.to_mass is None else self.to_mass

    def check(self, where: str) -> None:
        """Raise `StructureError` where a value lies outside its range."""
        _require(where, "thickness_nm", self.thickness_nm, _thickness_ok, _THICKNESS)
        _require(where, "edge_eV", self.edge_eV, _edge_ok, _EDGE)
        _require(where, "mass", self.mass, _mass_ok, _MASS)
        _require(where, "to_edge_eV", self.to_edge_eV, _edge_ok, _EDGE)
        _require(where, "to_mass", self.to_mass, _mass_ok, _MASS)
        _require(where, "permittivity", self.permittivity, _permittivity_ok, _PERMITTIVITY)
        _require(where, "donors_cm3", self.donors_cm3, _donors_ok, _DONORS)


@dataclass(frozen=True)
class Structure:
    """A stack of layers, left to right, between two contacts."""

    left: Contact
    layers: tuple[Layer, ...]
    right: Contact

    def __post_init__(self) -> None:
        if not 1 <= len(self.layers) <= MAX_LAYERS:
            allowed = f"a stack has 1 to {MAX_LAYERS} layers"
            raise StructureError("stack", "layer", len(self.layers), allowed)
        self.left.check("left")
        for number, layer in enumerate(self.layers, start=1):
            layer.check(f"layer {number}")
        self.right.check("right")
        if self.thickness_nm > MAX_THICKNESS_NM:
            allowed = f"a stack is at most {MAX_THICKNESS_NM:g} nm thick"
            raise StructureError("stack", "thickness_nm", self.thickness_nm, allowed)
        if (self.left.fermi_eV is None) != (self.right.fermi_eV is None):
            where = "left" if self.left.fermi_eV is None else "right"
            allowed = "state donors or a Fermi energy for both contacts, or for neither"
            raise StructureError(where, "fermi_eV", None, allowed)

    @property
    def thickness_nm(self) -> float:
        """Distance between the two contacts' faces."""
        return math.fsum(layer.thickness_nm for layer in self.layers)


def _require(
    where: str,
    key: str,
    value: float | None,
    accepted: Callable[[float], bool],
    allowed: str,
) -> None:
    # Written so that nan, which compares false with everything, is refused.
    if value is not None and not accepted(value):
        raise StructureError(where, key, value, allowed)


def _thickness_ok(value: float) -> bool:
    return 0.0 < value <= MAX_THICKNESS_NM


def _edge_ok(value: float) -> bool:
    return abs(value) <= MAX_EDGE_EV


def _mass_ok(value: float) -> bool:
    return MIN_MASS <= value <= MAX_MASS


def _fermi_ok(value: float) -> bool:
    return abs(value) <= MAX_FERMI_EV


def _donors_ok(value: float) -> bool:
    return 0.0 <= value <= MAX_DONORS_CM3


def _permittivity_ok(value: float) -> bool:
    return 1.0 <= value <= MAX_PERMITTIVITY


_THICKNESS = f"a thickness is above 0 and at most {MAX_THICKNESS_NM:g} nm"
_EDGE = f"a band edge lies between -{MAX_EDGE_EV:g} and {MAX_EDGE_EV:g} eV"
_MASS = f"a mass lies between {MIN_MASS:g} and {MAX_MASS:g} m0"
_FERMI = f"a Fermi energy lies between -{MAX_FERMI_EV:g} and {MAX_FERMI_EV:g} eV"
_DONORS = f"donors lie between 0 and {MAX_DONORS_CM3:g} cm^-3"
_PERMITTIVITY = f"a relative permittivity lies between 1 and {MAX_PERMITTIVITY:g}"
