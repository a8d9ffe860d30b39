"""Which old layer each new one came from, so that its comments go with it."""

from __future__ import annotations

import difflib
import itertools
from collections.abc import Iterable, Sequence
from dataclasses import fields

from tui.session.model import LayerEntry

Sources = list[int | None]

MOST_COMPARED = 1_000_000
"""Pairs of layers up to which the longest common parts are looked for: under a second."""
MOST_LIKENED = 20_000
"""Pairs up to which every old layer is held against every new one: under a second."""
ALIKE = 0.5
"""Share of values in common from which an edited layer is taken for the same."""


def sources(before: Sequence[LayerEntry], after: Sequence[LayerEntry]) -> Sources:
    """Find the old layer each new one came from: kept, moved or edited; None for a new one."""
    start = _common(before, after)
    rest = min(len(before), len(after)) - start
    end = _common(before[::-1][:rest], after[::-1][:rest])
    old, new = before[start : len(before) - end], after[start : len(after) - end]
    found: Sources = [None] * len(new)
    edited = _keep(old, new, found)
    _find_moved(old, new, found)
    _pair(found, [at for at in edited if likeness(old[at[0]], new[at[1]]) >= ALIKE])
    _pair(found, _likely(old, new, found))
    _pair(found, edited)
    middle = [None if source is None else source + start for source in found]
    return [*range(start), *middle, *range(len(before) - end, len(before))]


def likeness(one: LayerEntry, other: LayerEntry) -> float:
    """Give the share of what a layer states that the other states alike."""
    mine, yours = _stated(one), _stated(other)
    return len(mine & yours) / max(1, len(mine), len(yours))


def _stated(entry: LayerEntry) -> set[tuple[str, float | str]]:
    values = [(field, getattr(entry, field.name)) for field in fields(entry)]
    return {(field.name, value) for field, value in values if value != field.default}


def _pair(found: Sources, pairs: Iterable[tuple[int, int]]) -> None:
    """Note pairs of old and new where neither has a partner yet."""
    taken = {source for source in found if source is not None}
    for source, target in pairs:
        if found[target] is None and source not in taken:
            found[target] = source
            taken.add(source)


def _likely(
    old: Sequence[LayerEntry], new: Sequence[LayerEntry], found: Sources
) -> list[tuple[int, int]]:
    """Give pairs that were moved and edited, the most alike first."""
    taken = {source for source in found if source is not None}
    free = [at for at in range(len(old)) if at not in taken]
    new_ones = [at for at, source in enumerate(found) if source is None]
    if len(free) * len(new_ones) > MOST_LIKENED:
        return []
    scored = [(-likeness(old[one], new[at]), one, at) for one in free for at in new_ones]
    return [(one, at) for score, one, at in sorted(scored) if -score >= ALIKE]


def _common(one: Sequence[LayerEntry], other: Sequence[LayerEntry]) -> int:
    """Count how many layers two stacks begin with alike."""
    pairs = zip(one, other, strict=False)
    return sum(1 for _ in itertools.takewhile(lambda pair: pair[0] == pair[1], pairs))


def _keep(
    old: Sequence[LayerEntry], new: Sequence[LayerEntry], found: Sources
) -> list[tuple[int, int]]:
    """Note the layers that kept their place in the order; give pairs that may be edits."""
    if len(old) * len(new) > MOST_COMPARED:
        for at, (one, other) in enumerate(zip(old, new, strict=False)):
            if len(old) == len(new) and one == other:
                found[at] = at
        return [(at, at) for at in range(min(len(old), len(new)))]
    edited: list[tuple[int, int]] = []
    matcher = difflib.SequenceMatcher(None, old, new, autojunk=False)
    for tag, i1, i2, j1, j2 in matcher.get_opcodes():
        if tag == "equal":
            found[j1:j2] = range(i1, i2)
        elif tag == "replace":
            edited += zip(range(i1, i2), range(j1, j2), strict=False)
    return edited


def _find_moved(old: Sequence[LayerEntry], new: Sequence[LayerEntry], found: Sources) -> None:
    """Note the layers that are found elsewhere, the first equal one for the first."""
    taken = {source for source in found if source is not None}
    waiting: dict[LayerEntry, list[int]] = {}
    for at in reversed(range(len(old))):
        if at not in taken:
            waiting.setdefault(old[at], []).append(at)
    for target, layer in enumerate(new):
        if found[target] is None and waiting.get(layer):
            found[target] = waiting[layer].pop()
