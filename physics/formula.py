"""Chemical formulas of III-V alloys, as people write them.

``Al0.3Ga0.7As``, ``GaAs0.51Sb0.49``, ``In0.53Ga0.2Al0.27As``, ``(Al0.4Ga0.6)0.5In0.5P``: elements
in any order, each followed by its fraction of its sublattice; a bracket stands for one entry. One
fraction of a sublattice (or of a bracket) may be left out: it is then what the others miss to 1.
The fractions of each sublattice sum to 1 within `SUM_TOLERANCE` and are scaled to sum exactly.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from physics.errors import MaterialError

GROUP_III = ("Al", "Ga", "In")
GROUP_V = ("P", "As", "Sb")

SUM_TOLERANCE = 1e-6
"""Largest accepted |sum - 1|; three sixths of six written digits may lose this much."""
MAX_LENGTH = 80
"""Longest formula read, in characters; longer ones are mistakes."""

Fractions = dict[str, float]
_Entry = tuple[Fractions, float | None]
"""What shares one fraction (an element, or a bracket of several), and that fraction if stated."""

_NUMBER = r"[0-9]*\.?[0-9]+"
_ITEM = re.compile(
    rf"(?:(?P<element>[A-Z][a-z]?)|\((?P<bracket>[^()]*)\))(?P<fraction>{_NUMBER})?", re.ASCII
)


@dataclass(frozen=True)
class Composition:
    """Fractions of the elements on the two sublattices; each sums to 1, none is 0."""

    cations: tuple[tuple[str, float], ...]
    """Group III elements with their fractions, in the order of `GROUP_III`."""
    anions: tuple[tuple[str, float], ...]
    """Group V elements with their fractions, in the order of `GROUP_V`."""
    name: str
    """The formula with every fraction written out, in the user's order; a 1 is left out."""


def parse_formula(formula: str) -> Composition:
    """Read a formula such as ``Al0.3Ga0.7As``.

    Parameters
    ----------
    formula : str
        The formula; blanks around it are dropped.

    Returns
    -------
    Composition
        The fractions on both sublattices.

    Raises
    ------
    MaterialError
        The formula can't be read; an element is not among `GROUP_III` and `GROUP_V`; a fraction
        lies outside 0..1; a sublattice is missing, does not sum to 1 or leaves more than one
        fraction open. The message says which, and what would be accepted.
    """
    text = formula.strip(" ")
    if not 0 < len(text) <= MAX_LENGTH:
        found = "nothing" if not text else f"{len(text)} characters"
        raise _refusal(formula, f"found {found}", f"write 1 to {MAX_LENGTH} characters, {_EXAMPLE}")
    entries = _entries(formula, text)
    cations = _sublattice(formula, "III", GROUP_III, entries)
    anions = _sublattice(formula, "V", GROUP_V, entries)
    return Composition(
        cations=tuple((name, cations[name]) for name in GROUP_III if name in cations),
        anions=tuple((name, anions[name]) for name in GROUP_V if name in anions),
        name=_written(cations) + _written(anions),
    )


def _entries(formula: str, text: str) -> list[_Entry]:
    entries: list[_Entry] = []
    position = 0
    while position < len(text):
        item = _ITEM.match(text, position)
        if item is None:
            found = f"can't read {_shown(text[position:])}"
            raise _refusal(formula, found, f"write elements and their fractions, {_EXAMPLE}")
        entries.append(_entry(formula, item))
        position = item.end()
    return entries


def _entry(formula: str, item: re.Match[str]) -> _Entry:
    fraction = None if item["fraction"] is None else float(item["fraction"])
    if fraction is not None and not fraction <= 1.0:
        raise _refusal(formula, f"found the fraction {item['fraction']}", "a fraction lies in 0..1")
    element = item["element"]
    if element is None:
        inner = _entries(formula, item["bracket"])
        return _completed(formula, "the bracket's", inner), fraction
    if element not in GROUP_III and element not in GROUP_V:
        allowed = f"the elements are {', '.join(GROUP_III)} and {', '.join(GROUP_V)}"
        raise _refusal(formula, f"{element!r} is not in the catalogue", allowed)
    return {element: 1.0}, fraction


def _sublattice(
    formula: str, group: str, elements: tuple[str, ...], entries: list[_Entry]
) -> Fractions:
    mine = [entry for entry in entries if any(name in elements for name in entry[0])]
    if not mine:
        allowed = f"add at least one of {', '.join(elements)}, {_EXAMPLE}"
        raise _refusal(formula, f"no element of group {group}", allowed)
    for parts, _ in mine:
        if not all(name in elements for name in parts):
            allowed = "keep a bracket to group III or to group V"
            raise _refusal(formula, "a bracket holds elements of both groups", allowed)
    return _completed(formula, f"the group {group}", mine)


def _completed(formula: str, whose: str, entries: list[_Entry]) -> Fractions:
    """Fill in the one fraction that may be missing and scale the sum to exactly 1."""
    names = [name for parts, _ in entries for name in parts]
    twice = next((name for name in names if names.count(name) > 1), None)
    if twice is not None:
        raise _refusal(formula, f"{twice} appears twice", "name each element once")
    missing = _missing(formula, whose, [fraction for _, fraction in entries])
    filled = [(parts, missing if fraction is None else fraction) for parts, fraction in entries]
    total = math.fsum(fraction for _, fraction in filled)
    return {
        name: share * fraction / total
        for parts, fraction in filled
        for name, share in parts.items()
        if share * fraction > 0.0
    }


def _missing(formula: str, whose: str, fractions: list[float | None]) -> float:
    """Return what the one open fraction has to be; 0 where all are stated and sum to 1."""
    stated = math.fsum(fraction for fraction in fractions if fraction is not None)
    # A rounding beyond the tolerance, so that three times 0.333333 is within it.
    tolerance = SUM_TOLERANCE * (1.0 + 1e-9)
    open_count = fractions.count(None)
    if open_count > 1:
        allowed = f"state all of them, or all but one, {_EXAMPLE}"
        raise _refusal(formula, f"{open_count} of {whose} fractions are missing", allowed)
    if open_count == 1 and stated >= 1.0 - tolerance:
        allowed = f"nothing is left for the one that is missing; state all of them, {_EXAMPLE}"
        raise _refusal(formula, f"{whose} fractions sum to {stated:.9g}", allowed)
    if open_count == 0 and abs(stated - 1.0) > tolerance:
        allowed = f"they have to sum to 1, {_EXAMPLE}"
        raise _refusal(formula, f"{whose} fractions sum to {stated:.9g}", allowed)
    return 1.0 - stated if open_count else 0.0


def _written(fractions: Fractions) -> str:
    return "".join(name + _digits(fraction) for name, fraction in fractions.items())


def _digits(fraction: float) -> str:
    if fraction == 1.0:
        return ""
    return f"{fraction:.9f}".rstrip("0").rstrip(".")


_EXAMPLE = "as in 'Al0.3Ga0.7As' or 'GaAs0.51Sb0.49'"


def _refusal(formula: str, found: str, allowed: str) -> MaterialError:
    return MaterialError(f"material {_shown(formula)}: {found}; {allowed}")


def _shown(text: str) -> str:
    # repr, so that control characters never reach a terminal raw.
    return repr(text if len(text) <= MAX_LENGTH else text[:MAX_LENGTH] + "...")
