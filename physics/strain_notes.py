"""What there is to say about a stack's strain: what was shifted, and what would not stay strained.

Each note is a text with the number of the layer it speaks of, None where it is about the whole.
"""

from __future__ import annotations

from physics.structure import Layer, Structure

STRAINED = 1e-3
"""Mismatch to the substrate from which a layer is called strained."""

Note = tuple[str, int | None]


def strain_notes(structure: Structure) -> list[Note]:
    """Say what strain does to a stack.

    Parameters
    ----------
    structure : Structure
        With lattice constants and strains where they are known.
    """
    if not structure.substrate:
        return _unstrained(structure)
    return [
        *_shifted(structure),
        *_contacts(structure),
        *_thick(structure),
        *_whole(structure),
        *_stated(structure),
    ]


def _unstrained(structure: Structure) -> list[Note]:
    """One note a material whose lattice differs from the left contact's."""
    lattice = structure.left.lattice_nm
    if lattice is None:
        return []
    notes: dict[str, Note] = {}
    for number, layer in enumerate(structure.layers, start=1):
        mismatch = 0.0 if layer.lattice_nm is None else layer.lattice_nm / lattice - 1.0
        if abs(mismatch) >= STRAINED:
            sense = "compressed" if mismatch > 0.0 else "stretched"
            text = (
                f"layer {number} ({layer.name}) is {sense} by {100 * abs(mismatch):.2f} % on the "
                "left contact's lattice; its edge is the unstrained one: name the substrate in "
                "[growth] to shift it"
            )
            notes.setdefault(layer.name, (text, number))
    return list(notes.values())


def _shifted(structure: Structure) -> list[Note]:
    """One note a material, on the first layer that is made of it."""
    notes: dict[tuple[str, float], Note] = {}
    for number, layer in enumerate(structure.layers, start=1):
        ends = (layer.strain or 0.0, layer.to_strain or 0.0)
        if max(abs(end) for end in ends) < STRAINED:
            continue
        key = (layer.name, ends[1])
        text = f"layer {number} ({layer.name}) is {_said(ends[0], layer.edge_shift_eV)}"
        if layer.to_strain is not None:
            text += f", at its right face {_said(ends[1], None)}"
        text += f", on {structure.substrate}; its edges at X and L are the unstrained ones"
        notes.setdefault(key, (text, number))
    return list(notes.values())


def _said(strain: float, shift_eV: float | None) -> str:
    text = f"{'compressed' if strain < 0.0 else 'stretched'} by {100 * abs(strain):.2f} %"
    return text if shift_eV is None else f"{text}, its edge moved by {1e3 * shift_eV:+.1f} meV"


def _contacts(structure: Structure) -> list[Note]:
    """Say which contacts are strained; one has no end, so it is too thick for any strain."""
    notes: list[Note] = []
    for side, contact in (("left", structure.left), ("right", structure.right)):
        strain = contact.strain or 0.0
        if abs(strain) >= STRAINED:
            text = (
                f"{side} contact ({contact.name}) is {_said(strain, contact.edge_shift_eV)}, on "
                f"{structure.substrate}; {_critical(contact.critical_nm)}: a thick one relaxes"
            )
            notes.append((text, None))
    return notes


def _thick(structure: Structure) -> list[Note]:
    """One warning a material, on its thickest layer."""
    worst: dict[str, tuple[float, int, Layer]] = {}
    for number, layer in enumerate(structure.layers, start=1):
        if layer.critical_nm is None or layer.thickness_nm <= layer.critical_nm:
            continue
        before = worst.get(layer.name, (0.0, 0, layer))
        worst[layer.name] = max(before, (layer.thickness_nm, number, layer), key=lambda one: one[0])
    end = "expect dislocations, and part of the strain gone"
    return [
        (f"layer {n} ({one.name}) is {nm:.2f} nm thick; {_critical(one.critical_nm)}: {end}", n)
        for nm, n, one in worst.values()
    ]


def _whole(structure: Structure) -> list[Note]:
    """Weigh the strain that layers of opposite sense leave over; one layer has been spoken of."""
    limit = structure.critical_nm
    is_over = limit is not None and structure.thickness_nm > limit
    if not is_over or len(structure.layers) == 1:
        return []
    strain = structure.mean_strain
    text = (
        f"the stack as a whole, {structure.thickness_nm:.2f} nm, is {_said(strain, None)} on "
        f"average; {_critical(limit)}: balance it with layers of the opposite strain"
    )
    return [(text, None)]


def _stated(structure: Structure) -> list[Note]:
    """Say which layers and contacts were left as stated."""
    numbers = [n for n, layer in enumerate(structure.layers, start=1) if layer.strain is None]
    parts = [f"layer{'s' if numbers[1:] else ''} {_listed(numbers)}"] if numbers else []
    parts += [
        f"the {side} contact"
        for side, contact in (("left", structure.left), ("right", structure.right))
        if contact.strain is None
    ]
    if not parts:
        return []
    return [(f"taken as stated, whatever the strain: {', '.join(parts)}", None)]


def _listed(numbers: list[int]) -> str:
    """Write a few numbers out, many by their first and how many they are."""
    few = ", ".join(str(number) for number in numbers[:4])
    return few if len(numbers) <= 4 else f"{few} ... ({len(numbers)} of them)"


def _critical(critical_nm: float | None) -> str:
    if not critical_nm:
        return "its critical thickness is below two monolayers"
    return f"its critical thickness is {critical_nm:.3g} nm"
