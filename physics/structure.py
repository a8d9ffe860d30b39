"""What is described: layers between two half-infinite contacts.

Energies are in eV on one common scale (zero at the left contact's band edge unless the left
contact itself states another), lengths in nm, masses in units of the free electron mass. Values
check themselves at birth and never change.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from physics.errors import StructureError
from physics.ranges import (
    DONORS_CM3,
    EDGE_EV,
    FERMI_EV,
    GAP_EV,
    MASS,
    PERMITTIVITY,
    THICKNESS_NM,
    Range,
)

MAX_LAYERS = 20_000


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
    """Unstrained lattice constant; the left contact's is the substrate's where none is named."""
    strain: float | None = None
    """Strain in the plane, positive where stretched; None where it is not known."""
    edge_shift_eV: float | None = None
    """What strain has added to the edge, the common zero apart."""
    critical_nm: float | None = None
    """Critical thickness under a free surface; None without strain, 0 where no layer holds it."""
    gap_eV: float | None = None
    """Direct gap, that the mass grows with the energy by where the band is not parabolic."""

    def check(self, where: str) -> None:
        """Raise `StructureError` where a value lies outside its range."""
        _require(where, "edge_eV", self.edge_eV, EDGE_EV)
        _require(where, "mass", self.mass, MASS)
        _require(where, "fermi_eV", self.fermi_eV, FERMI_EV)
        _require(where, "donors_cm3", self.donors_cm3, DONORS_CM3)
        _require(where, "permittivity", self.permittivity, PERMITTIVITY)
        _require(where, "gap_eV", self.gap_eV, GAP_EV)


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
    """Unstrained lattice constant (at the left face, as all from here on)."""
    monolayer_nm: float | None = None
    x_edge_eV: float | None = None
    """Lowest conduction-band edge at X, on the same scale as ``edge_eV``, where it is known."""
    l_edge_eV: float | None = None
    gap_eV: float | None = None
    """Direct gap, that the mass grows with the energy by where the band is not parabolic."""
    to_gap_eV: float | None = None
    """Direct gap at the right face; None: as at the left one."""
    strain: float | None = None
    """Strain in the plane, positive where stretched; None where it is not known."""
    to_strain: float | None = None
    """Strain at the right face; None: as at the left one, or not known."""
    edge_shift_eV: float | None = None
    """What strain has added to the edge, the common zero apart."""
    critical_nm: float | None = None
    """Critical thickness, buried; None without strain, 0 where no layer holds it."""

    @property
    def right_edge_eV(self) -> float:
        """Band edge at the right face."""
        return self.edge_eV if self.to_edge_eV is None else self.to_edge_eV

    @property
    def mean_strain(self) -> float | None:
        """Strain in the plane, averaged over the thickness."""
        if self.strain is None or self.to_strain is None:
            return self.strain
        return 0.5 * (self.strain + self.to_strain)

    @property
    def right_mass(self) -> float:
        """Mass at the right face."""
        return self.mass if self.to_mass is None else self.to_mass

    @property
    def right_gap_eV(self) -> float | None:
        """Direct gap at the right face."""
        return self.gap_eV if self.to_gap_eV is None else self.to_gap_eV

    def check(self, where: str) -> None:
        """Raise `StructureError` where a value lies outside its range."""
        _require(where, "thickness_nm", self.thickness_nm, THICKNESS_NM)
        _require(where, "edge_eV", self.edge_eV, EDGE_EV)
        _require(where, "mass", self.mass, MASS)
        _require(where, "to_edge_eV", self.to_edge_eV, EDGE_EV)
        _require(where, "to_mass", self.to_mass, MASS)
        _require(where, "permittivity", self.permittivity, PERMITTIVITY)
        _require(where, "donors_cm3", self.donors_cm3, DONORS_CM3)
        _require(where, "gap_eV", self.gap_eV, GAP_EV)
        _require(where, "to_gap_eV", self.to_gap_eV, GAP_EV)


@dataclass(frozen=True)
class Structure:
    """A stack of layers, left to right, between two contacts."""

    left: Contact
    layers: tuple[Layer, ...]
    right: Contact
    substrate: str = ""
    """The material on whose lattice all is grown; empty where none is named."""
    critical_nm: float | None = None
    """Critical thickness of the stack as a whole at its `mean_strain`; as a layer's."""

    def __post_init__(self) -> None:
        if not 1 <= len(self.layers) <= MAX_LAYERS:
            allowed = f"a stack has 1 to {MAX_LAYERS} layers"
            raise StructureError("stack", "layer", len(self.layers), allowed)
        self.left.check("left")
        for number, layer in enumerate(self.layers, start=1):
            layer.check(f"layer {number}")
        self.right.check("right")
        if not THICKNESS_NM.holds(self.thickness_nm):
            allowed = f"a stack is at most {THICKNESS_NM.high:g} nm thick"
            raise StructureError("stack", "thickness_nm", self.thickness_nm, allowed)
        if (self.left.fermi_eV is None) != (self.right.fermi_eV is None):
            where = "left" if self.left.fermi_eV is None else "right"
            allowed = "state donors or a Fermi energy for both contacts, or for neither"
            raise StructureError(where, "fermi_eV", None, allowed)

    @property
    def thickness_nm(self) -> float:
        """Distance between the two contacts' faces."""
        return math.fsum(layer.thickness_nm for layer in self.layers)

    @property
    def mean_strain(self) -> float:
        """Strain in the plane, averaged over the stack; a layer without a known one adds none."""
        total = math.fsum((layer.mean_strain or 0.0) * layer.thickness_nm for layer in self.layers)
        return total / self.thickness_nm


def _require(where: str, key: str, value: float | None, allowed: Range) -> None:
    if value is not None and not allowed.holds(value):
        raise StructureError(where, key, value, allowed.allowed)
