"""A session as its user wrote it: materials by name, thickness in either unit, nothing resolved.

These frozen values are what the workbench edits, what undo steps through, and what the session
text reads into and writes back from. `tui.session.resolve` turns one into the numbers that
``physics`` works with.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

from physics.band import Band
from physics.levels import DEFAULT_MAX_WIDTH_EV

FieldModel = Literal["uniform", "screened"]
ChargeModel = Literal["semi-classical", "quantum"]


@dataclass(frozen=True)
class Conditions:
    """Temperature, bias, the models, and how coherence is lost (none stated: not at all)."""

    temperature_K: float = 300.0
    bias_V: float = 0.0
    field: FieldModel = "uniform"
    charge: ChargeModel = "semi-classical"
    """Electrons between the barriers; it matters to the screened field alone."""
    band: Band = "parabolic"
    dephasing_eV: float | None = None
    scattering_time_s: float | None = None
    mobility_cm2_Vs: float | None = None


@dataclass(frozen=True)
class Growth:
    """What the stack is grown on."""

    substrate: str | None = None
    """A formula of the catalogue; None: nothing is strained."""


@dataclass(frozen=True)
class ContactEntry:
    """A contact: a material, or an edge with a mass; with donors, a Fermi energy, or neither."""

    material: str | None = None
    edge_eV: float | None = None
    mass: float | None = None
    donors_cm3: float | None = None
    fermi_eV: float | None = None
    permittivity: float | None = None
    gap_eV: float | None = None


@dataclass(frozen=True)
class LayerEntry:
    """A layer: a material, or an edge with a mass; a thickness in nm or in monolayers."""

    label: str = ""
    material: str | None = None
    edge_eV: float | None = None
    mass: float | None = None
    thickness_nm: float | None = None
    thickness_ml: float | None = None
    donors_cm3: float = 0.0
    permittivity: float | None = None
    to_material: str | None = None
    to_edge_eV: float | None = None
    to_mass: float | None = None
    gap_eV: float | None = None
    to_gap_eV: float | None = None


@dataclass(frozen=True)
class MaterialEntry:
    """A user's own material; its edge is on the scale of the session's other edges."""

    name: str
    edge_eV: float
    mass: float
    permittivity: float | None = None
    monolayer_nm: float | None = None
    gap_eV: float | None = None


@dataclass(frozen=True)
class View:
    """What is looked at: the energy window and the broadest level of interest."""

    from_eV: float | None = None
    """None: the lowest band edge."""
    to_eV: float | None = None
    """None: the highest band edge."""
    max_width_eV: float = DEFAULT_MAX_WIDTH_EV


@dataclass(frozen=True)
class SweepEntry:
    """The range of a current curve, and what is laid over it."""

    from_V: float | None = None
    """None: 0."""
    to_V: float | None = None
    """None: what the barriers suggest."""
    overlay_K: str = ""
    """Further temperatures whose curves are shown, in K, blanks between."""


@dataclass(frozen=True)
class DeviceEntry:
    """The device that the stack is made into; None: not stated."""

    mesa_um2: float | None = None
    series_ohm: float | None = None
    parallel_fF: float | None = None


@dataclass(frozen=True)
class ToleranceEntry:
    """What growth leaves to chance: standard deviations, None where exact; and how it is drawn."""

    rate_percent: float | None = None
    """Growth rate, one drift for all layers of a material."""
    thickness_nm: float | None = None
    """Thickness of each layer for itself."""
    thickness_ml: float | None = None
    """The same in monolayers of the layer."""
    composition: float | None = None
    """Fraction of an alloy, one error for all layers of its formula."""
    donors_percent: float | None = None
    """Donors, for each doped layer and contact."""
    grading_nm: float | None = None
    """Mean width of the linear grade that all interfaces of a run share."""
    draws: int = 1024
    seed: int = 1


@dataclass(frozen=True)
class SpecEntry:
    """A specification: a result by its name (`tui.outcome`), and its bounds."""

    result: str
    at_least: float | None = None
    at_most: float | None = None


@dataclass(frozen=True)
class Session:
    """A whole session text."""

    title: str = ""
    notes: str = ""
    conditions: Conditions = field(default_factory=Conditions)
    left: ContactEntry = field(default_factory=ContactEntry)
    layers: tuple[LayerEntry, ...] = ()
    right: ContactEntry = field(default_factory=ContactEntry)
    materials: tuple[MaterialEntry, ...] = ()
    view: View = field(default_factory=View)
    sweep: SweepEntry = field(default_factory=SweepEntry)
    device: DeviceEntry = field(default_factory=DeviceEntry)
    growth: Growth = field(default_factory=Growth)
    tolerance: ToleranceEntry = field(default_factory=ToleranceEntry)
    specs: tuple[SpecEntry, ...] = ()
