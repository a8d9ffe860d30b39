"""The form's rows: what is shown in each field, and which value it stands for."""

from __future__ import annotations

from dataclasses import dataclass

from physics.structure import Contact, Layer, Structure
from tui.session.model import ContactEntry, LayerEntry, Session
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
CONTACT_KEYS = ("material", "edge_eV", "mass", "donors_cm3", "fermi_eV", "permittivity")


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


def rows_of(session: Session, structure: Structure | None) -> list[Row]:
    """Lay a session out: conditions, left contact, layers, right contact.

    Parameters
    ----------
    structure : Structure, optional
        The session resolved, for the numbers that follow from materials.
    """
    rows = [_conditions(session)]
    left = None if structure is None else structure.left
    right = None if structure is None else structure.right
    rows.append(_contact(("left", 0), "left contact", session.left, left))
    for n, entry in enumerate(session.layers):
        layer = None if structure is None else structure.layers[n]
        rows.append(_layer(n, entry, layer))
    rows.append(_contact(("right", 0), "right contact", session.right, right))
    return rows


def _conditions(session: Session) -> Row:
    conditions, view = session.conditions, session.view
    given, seen = ("conditions", 0), ("view", 0)
    fields = (
        Field(given, "temperature_K", f"{conditions.temperature_K:g}", 6, "temp. K"),
        Field(given, "bias_V", f"{conditions.bias_V:g}", 7, "bias V"),
        Field(seen, "from_eV", _number(view.from_eV, "auto"), 6, "from eV"),
        Field(seen, "to_eV", _number(view.to_eV, "auto"), 6, "to eV"),
        Field(seen, "max_width_eV", f"{view.max_width_eV:.3g}", 6, "widest eV"),
    )
    return Row("", fields)


def _contact(place: Place, name: str, entry: ContactEntry, part: Contact | None) -> Row:
    fields = []
    for column in COLUMNS:
        if column.key not in CONTACT_KEYS:
            text = name if column.key == "label" else ""
            fields.append(_field(place, column, text, stated=False, is_open=False))
            continue
        value = getattr(entry, column.key)
        follows = None if part is None else getattr(part, column.key, None)
        text = _text(column.key, value, follows)
        fields.append(_field(place, column, text, stated=value is not None))
    return Row(place[0][0].upper(), tuple(fields))


def _layer(index: int, entry: LayerEntry, part: Layer | None) -> Row:
    place, fields = ("layer", index), []
    for column in COLUMNS:
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
