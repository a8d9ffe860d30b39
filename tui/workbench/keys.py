"""The one registry of keys: the bindings and the help screen both come from it.

And keys one after the other: over a slow link a word arrives at once, and its first letter may open
the line that the rest belongs into. Textual hands on all of them before it acts on the first.
"""

from __future__ import annotations

import time
from collections import deque
from dataclasses import dataclass
from typing import Generic, TypeVar

from textual import events
from textual.app import App
from textual.message_pump import MessagePump


@dataclass(frozen=True)
class Key:
    """One action with the keys that call it."""

    keys: str
    """Textual's names, separated by commas."""
    shown: str
    action: str
    text: str
    group: str
    current: str = ""
    """What it does in the current view, where that is something else."""


FORM, STACK, ENERGY, CURRENT, DESIGN, SCREEN = (
    "Form",
    "Stack",
    "Energy line",
    "Current view",
    "Design",
    "Screen",
)

KEYS = (
    Key("up", "up", "go(-1, 0)", "one row up", FORM),
    Key("down", "down", "go(1, 0)", "one row down", FORM),
    Key("pageup", "PageUp", "go(-10, 0)", "ten rows up", FORM),
    Key("pagedown", "PageDown", "go(10, 0)", "ten rows down", FORM),
    Key("home", "Home", "go(-99999, 0)", "to the conditions", FORM),
    Key("end", "End", "go(99999, 0)", "to the right contact", FORM),
    Key("left,shift+tab", "left", "go(0, -1)", "one field to the left", FORM),
    Key("right,tab", "right", "go(0, 1)", "one field to the right", FORM),
    Key("enter", "Enter", "change", "type a value; a digit begins one at once", FORM),
    Key("plus,equals_sign", "+", "step(1)", "up by a monolayer or a unit, an alloy by 0.01", FORM),
    Key("minus", "-", "step(-1)", "down by a monolayer or a unit, an alloy by 0.01", FORM),
    Key("greater_than_sign", ">", "fine_step(1)", "up by a tenth of a unit", FORM),
    Key("less_than_sign", "<", "fine_step(-1)", "down by a tenth of a unit", FORM),
    Key("backspace,delete", "Backspace", "clear", "empty the field", FORM),
    Key("a", "a", "add", "add a layer behind this one", STACK),
    Key("d", "d", "duplicate", "duplicate this layer", STACK),
    Key("x", "x", "remove", "delete this layer", STACK),
    Key("left_square_bracket", "[", "move(-1)", "move this layer towards the left contact", STACK),
    Key("right_square_bracket", "]", "move(1)", "move this layer towards the right contact", STACK),
    Key("s", "s", "split", "split this layer in two halves", STACK),
    Key("m", "m", "mirror", "mirror the stack about this layer", STACK),
    Key("v", "v", "turn", "turn this layer's grade round", STACK),
    Key("n", "n", "level(1)", "to the next level up", ENERGY, "to the next onset, peak or valley"),
    Key("p", "p", "level(-1)", "to the next level down", ENERGY, "to the one before"),
    Key("k", "k", "line(1)", "one row up", ENERGY, "the bias line one step up"),
    Key("j", "j", "line(-1)", "one row down", ENERGY, "the bias line one step down"),
    Key("K", "K", "fine_line(1)", "a tenth of a row up", ENERGY, "a tenth of a step up"),
    Key("J", "J", "fine_line(-1)", "a tenth of a row down", ENERGY, "a tenth of a step down"),
    Key("e", "e", "energy", "type an energy", ENERGY, "type a bias"),
    Key("c", "c", "switch_view", "bands, or the current over bias", CURRENT),
    Key("l", "l", "scale", "the current's size in decades, or the current", CURRENT),
    Key("O", "O", "overlays", "type temperatures whose curves are laid over", CURRENT),
    Key("escape", "Esc", "break_off", "break off the computation of the current", CURRENT),
    Key("C", "C", "compute_current", "compute it after all", CURRENT),
    Key("u", "u", "undo", "undo", DESIGN),
    Key("r", "r", "redo", "redo", DESIGN),
    Key("t", "t", "title", "change the title", DESIGN),
    Key("T", "T", "session_notes", "change the design's notes, \\n for a new line", DESIGN),
    Key("o", "o", "open", "open a file", DESIGN),
    Key("w,ctrl+s", "w", "save", "save (write) the file", DESIGN),
    Key("W", "W", "save_as", "save under another name", DESIGN),
    Key("N", "N", "new", "begin a new design", DESIGN),
    Key("q,ctrl+q,ctrl+c", "q", "leave", "quit; unsaved work is asked about", DESIGN),
    Key("question_mark,f1", "?", "help", "this list", SCREEN),
    Key("i", "i", "notes", "the notes on this answer in full", SCREEN),
    Key("ctrl+l", "Ctrl+L", "redraw", "draw the screen anew", SCREEN),
    Key("ctrl+z", "Ctrl+Z", "suspend_process", "leave for the shell; fg comes back", SCREEN),
)


LONGEST_KEY_S = 0.5
"""A key that takes longer no longer holds up the next one; none should."""
Result = TypeVar("Result")


class KeysInTurn(App[Result], Generic[Result], inherit_bindings=False):
    """An application that takes a key, or what is pasted, only when the one before is done."""

    def __init__(self) -> None:
        super().__init__()
        self._typed: deque[events.Key | events.Paste] = deque()
        self._begun_at = 0.0

    @property
    def are_keys_waiting(self) -> bool:
        """Whether more has been typed than was acted on."""
        return bool(self._typed)

    async def on_event(self, event: events.Event) -> None:
        """Put what is typed into the queue, anything else on its way."""
        if not isinstance(event, (events.Key, events.Paste)) or event.is_forwarded:
            await super().on_event(event)
            return
        self._typed.append(event)
        late = time.monotonic() - self._begun_at > LONGEST_KEY_S
        if len(self._typed) == 1 or late:
            await self._take_next()

    async def _take_next(self) -> None:
        self._begun_at = time.monotonic()
        target = self.focused or self.screen
        event = self._typed[0]
        await super().on_event(event)
        # Twice: what a binding of the target does begins its own way once the first has ended.
        way: list[MessagePump] = [*target.ancestors_with_self] * 2
        await self._follow(event, way)

    async def _follow(self, event: events.Event, way: list[MessagePump]) -> None:
        """Go the way that a key goes, behind it; where it ends the key has done what it does."""
        while way:
            if way.pop(0).call_later(self._follow, event, way):
                return
        if self._typed and self._typed[0] is event:
            self._typed.popleft()
            if self._typed:
                await self._take_next()
            else:
                self.all_keys_done()

    def all_keys_done(self) -> None:
        """Do what is better done once than after each key of a burst."""


def help_lines() -> list[str]:
    """Write the list of keys, by group."""
    lines: list[str] = []
    for group in dict.fromkeys(key.group for key in KEYS):
        lines += ["", group] if lines else [group]
        for key in KEYS:
            if key.group == group:
                others = [_plain(k) for k in key.keys.split(",")[1:]]
                also = f"  (also {', '.join(others)})" if others else ""
                lines.append(f"  {key.shown:<10} {key.text}{also}")
            elif key.current and group == CURRENT:
                lines.append(f"  {key.shown:<10} {key.current}")
    return lines


def _plain(name: str) -> str:
    known = {"equals_sign": "=", "f1": "F1", "delete": "Del"}
    if name in known:
        return known[name]
    return "+".join(part.capitalize() for part in name.split("+"))
