"""The form's rows: what is shown in each field, and which value it stands for."""

from __future__ import annotations

from dataclasses import dataclass

from physics.structure import Contact, Layer, Structure
from tui.session.model import Conditions, ContactEntry, LayerEntry, Session
from tui.workbench.values import Place


@dataclass(frozen=True)
class Column:
    """One column of contacts and layers."""

    key: str
    head: str
    width: int
    left_aligned: bool = False


COLUMNS = (
    Column("label", "label", 14, left_aligned=True),
    Column("material", "material", 14, left_aligned=True),
    Column("thickness_nm", "nm", 8),
    Column("thickness_ml", "ml", 6),
    Column("edge_eV", "edge eV", 8),
    Column("mass", "mass m0", 7),
    Column("donors_cm3", "donors cm-3", 11),
    Column("fermi_eV", "Fermi eV", 8),
    Column("permittivity", "permitt.", 8),
    Column("to_material", "to material", 14, left_aligned=True),
    Column("to_edge_eV", "to edge eV", 10),
    Column("to_mass", "to mass", 7),
)
CONTACT_KEYS = ("material", "edge_eV", "mass", "gap_eV", "donors_cm3", "fermi_eV", "permittivity")
GAP, TO_GAP = Column("gap_eV", "gap eV", 7), Column("to_gap_eV", "to gap", 7)
"""Columns of a band whose mass goes with the gap."""
NOT_STATED = "-"


@dataclass(frozen=True)
class Field:
    """One field: what it shows and what it stands for."""

    place: Place
    key: str
    text: str
    width: int
    head: str
    stated: bool = True
    """Whether the user wrote it; what follows from a material is shown fainter."""
    left_aligned: bool = False
    open: bool = True
    """Whether it can be changed."""


@dataclass(frozen=True)
class Row:
    """One row of the form."""

    name: str
    fields: tuple[Field, ...]

    @property
    def place(self) -> Place:
        """The part of the session that the row stands for."""
        return self.fields[0].place


def rows_of(
    session: Session, structure: Structure | None, *, of_current: bool = False
) -> list[Row]:
    """Lay a session out: conditions, left contact, layers, right contact.

    Parameters
    ----------
    structure : Structure, optional
        The session resolved, for the numbers that follow from materials.
    of_current : bool
        Whether the conditions are those of a current: its range and the device, not the window.
    """
    columns = columns_of(session)
    rows = [_conditions(session, of_current=of_current)]
    left = None if structure is None else structure.left
    right = None if structure is None else structure.right
    rows.append(_contact(("left", 0), "left contact", session.left, left, columns))
    for n, entry in enumerate(session.layers):
        layer = None if structure is None else structure.layers[n]
        rows.append(_layer(n, entry, layer, columns))
    rows.append(_contact(("right", 0), "right contact", session.right, right, columns))
    return rows


def columns_of(session: Session) -> tuple[Column, ...]:
    """Choose the columns that matter to a session's band."""
    if session.conditions.band == "parabolic":
        return COLUMNS
    behind = next(n for n, column in enumerate(COLUMNS) if column.key == "mass") + 1
    return (*COLUMNS[:behind], GAP, *COLUMNS[behind:], TO_GAP)


def _conditions(session: Session, *, of_current: bool) -> Row:
    conditions = session.conditions
    given = ("conditions", 0)
    first = (
        Field(given, "temperature_K", f"{conditions.temperature_K:g}", 6, "temp. K"),
        Field(given, "bias_V", f"{conditions.bias_V:g}", 7, "bias V"),
    )
    models = [
        Field(given, "band", conditions.band, 9, "band"),
        Field(given, "field", conditions.field, 8, "field"),
    ]
    if conditions.field == "screened":
        models.append(Field(given, "charge", conditions.charge, 14, "charge"))
    substrate = Field(("growth", 0), "substrate", session.growth.substrate or "-", 10, "substrate")
    last = (_coherence(conditions), substrate)
    if of_current:
        return Row("", (*first, *models, *_sweep(session), *_device(session), *last))
    return Row("", (*first, *_window(session), *models, *last))


def _coherence(conditions: Conditions) -> Field:
    """Show how coherence is lost, in the way that it is stated."""
    ways = {"scattering_time_s": "scatter. s", "mobility_cm2_Vs": "cm2/Vs"}
    stated = (key for key in ways if getattr(conditions, key) is not None)
    key = "dephasing_eV" if conditions.dephasing_eV is not None else next(stated, "dephasing_eV")
    text = _number(getattr(conditions, key), NOT_STATED)
    return Field(("conditions", 0), key, text, 8, ways.get(key, "dephasing eV"))


def _window(session: Session) -> tuple[Field, ...]:
    view, seen = session.view, ("view", 0)
    return (
        Field(seen, "from_eV", _number(view.from_eV, "auto"), 6, "from eV"),
        Field(seen, "to_eV", _number(view.to_eV, "auto"), 6, "to eV"),
        Field(seen, "max_width_eV", f"{view.max_width_eV:.3g}", 6, "widest eV"),
    )


def _sweep(session: Session) -> tuple[Field, ...]:
    sweep, swept = session.sweep, ("sweep", 0)
    return (
        Field(swept, "from_V", _number(sweep.from_V, "auto"), 6, "from V"),
        Field(swept, "to_V", _number(sweep.to_V, "auto"), 6, "to V"),
    )


def _device(session: Session) -> tuple[Field, ...]:
    device, made = session.device, ("device", 0)
    return (
        Field(made, "mesa_um2", _number(device.mesa_um2, NOT_STATED), 6, "mesa um2"),
        Field(made, "series_ohm", _number(device.series_ohm, NOT_STATED), 6, "series ohm"),
        Field(made, "parallel_fF", _number(device.parallel_fF, NOT_STATED), 6, "parallel fF"),
    )


def _contact(
    place: Place,
    name: str,
    entry: ContactEntry,
    part: Contact | None,
    columns: tuple[Column, ...],
) -> Row:
    fields = []
    for column in columns:
        if column.key not in CONTACT_KEYS:
            text = name if column.key == "label" else ""
            fields.append(_field(place, column, text, stated=False, is_open=False))
            continue
        value = getattr(entry, column.key)
        follows = None if part is None else getattr(part, column.key, None)
        text = _text(column.key, value, follows)
        fields.append(_field(place, column, text, stated=value is not None))
    return Row(place[0][0].upper(), tuple(fields))


def _layer(index: int, entry: LayerEntry, part: Layer | None, columns: tuple[Column, ...]) -> Row:
    place, fields = ("layer", index), []
    for column in columns:
        if column.key == "fermi_eV":
            fields.append(_field(place, column, "", stated=False, is_open=False))
            continue
        value = getattr(entry, column.key)
        text = _text(column.key, value, _follows(column.key, part))
        fields.append(_field(place, column, text, stated=value is not None))
    return Row(str(index + 1), tuple(fields))


def _follows(key: str, part: Layer | None) -> float | None:
    """Find what a value is where the session does not say it."""
    if part is None:
        return None
    if key == "thickness_ml":
        return part.thickness_nm / part.monolayer_nm if part.monolayer_nm else None
    value = getattr(part, key, None)
    return value if isinstance(value, (int, float)) else None


def _field(place: Place, column: Column, text: str, *, stated: bool, is_open: bool = True) -> Field:
    return Field(
        place, column.key, text, column.width, column.head, stated, column.left_aligned, is_open
    )


def _text(key: str, value: float | str | None, follows: float | None) -> str:
    shown = follows if value is None else value
    if shown is None or isinstance(shown, str):
        return shown or ""
    if key == "donors_cm3":
        return "" if shown == 0.0 else f"{shown:.4g}"
    digits = {"thickness_nm": 4, "thickness_ml": 2, "permittivity": 2}.get(key, 4)
    return f"{shown:.{digits}f}"


def _number(value: float | None, otherwise: str) -> str:
    return otherwise if value is None else f"{value:g}"
