"""The one registry of keys: the bindings and the help screen both come from it."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Key:
    """One action with the keys that call it."""

    keys: str
    """Textual's names, separated by commas."""
    shown: str
    action: str
    text: str
    group: str


FORM, STACK, ENERGY, DESIGN, SCREEN = (
    "Form",
    "Stack",
    "Energy line",
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
    Key("plus,equals_sign", "+", "step(1)", "up by one monolayer or one unit", FORM),
    Key("minus", "-", "step(-1)", "down by one monolayer or one unit", FORM),
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
    Key("n", "n", "level(1)", "to the next level up", ENERGY),
    Key("p", "p", "level(-1)", "to the next level down", ENERGY),
    Key("k", "k", "line(1)", "one row up", ENERGY),
    Key("j", "j", "line(-1)", "one row down", ENERGY),
    Key("K", "K", "fine_line(1)", "a tenth of a row up", ENERGY),
    Key("J", "J", "fine_line(-1)", "a tenth of a row down", ENERGY),
    Key("e", "e", "energy", "type an energy", ENERGY),
    Key("u", "u", "undo", "undo", DESIGN),
    Key("r", "r", "redo", "redo", DESIGN),
    Key("t", "t", "title", "change the title", DESIGN),
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
    return lines


def _plain(name: str) -> str:
    known = {"equals_sign": "=", "f1": "F1", "delete": "Del"}
    if name in known:
        return known[name]
    return "+".join(part.capitalize() for part in name.split("+"))
