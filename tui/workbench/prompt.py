"""The lowest line, which says things, and the fields that are typed into."""

from __future__ import annotations

from collections.abc import Callable

from textual.app import ComposeResult
from textual.binding import Binding
from textual.containers import Horizontal
from textual.geometry import Region
from textual.widgets import Input

from tui.workbench.panes import Pane

Accept = Callable[[str], str]
"""Takes what was typed; an empty answer means that it was taken, another says why not."""
LEAST_LINE, LEAST_FIELD = 16, 12
"""Least room to type in beside a label, and in a field of the form."""
IN_FULL = " ... i: in full"


class TypedLine(Input):
    """A line to type into; Escape gives up, and what is refused stays to be mended."""

    BINDINGS = [Binding("escape", "give_up", show=False)]  # noqa: RUF012  Textual's way

    def action_give_up(self) -> None:
        """Close the line without taking what it holds."""
        prompt = self.parent
        if isinstance(prompt, Prompt):
            prompt.close()


class Prompt(Horizontal):
    """Shows a message; asks for a line of text, beside its label or in a field of the form."""

    def __init__(self, *, id: str) -> None:  # noqa: A002
        super().__init__(id=id)
        self._accept: Accept | None = None
        self._label = ""
        self._field: Region | None = None
        self._idle = ("", "faint")

    def compose(self) -> ComposeResult:
        """Lay out label and lines."""
        yield Pane(id="prompt-label")
        for name in ("prompt-line", "field-line"):
            line = TypedLine(id=name, compact=True, select_on_focus=False)
            line.cursor_blink = False  # nothing is sent while nothing is typed
            yield line

    @property
    def is_open(self) -> bool:
        """Whether a line is being typed."""
        return self._accept is not None

    @property
    def line(self) -> TypedLine:
        """The line that is typed into, or was last."""
        name = "#prompt-line" if self._field is None else "#field-line"
        return self.query_one(name, TypedLine)

    def say(self, text: str, role: str = "faint") -> None:
        """Show a message where no line is being typed."""
        self._idle = (text, role)
        if not self.is_open:
            self._show_label(text, role)

    def ask(self, label: str, initial: str, accept: Accept, field: Region | None = None) -> None:
        """Ask for a line of text, in a field on the screen where one is given."""
        self._accept, self._label, self._field = accept, label, field
        self.set_class(field is None, "asking")
        self.set_class(field is not None, "in-field")
        if field is not None:
            self.move_to(field)
        self._show_label(label, "strong")
        line = self.line
        line.value = initial
        line.cursor_position = len(initial)
        # At once: the next letter belongs here.
        self.screen.set_focus(line)

    def move_to(self, field: Region) -> None:
        """Put the line over a field of the form, if that is where it is typed."""
        if not self.is_open or self._field is None:
            return
        self._field = field
        # Out to the left: numbers stand at the right ends of their fields.
        width = max(field.width + 2, LEAST_FIELD)
        left = max(0, min(field.right + 1, self.app.size.width) - width)
        line = self.line
        line.styles.width = width
        line.styles.offset = (left - self.region.x, field.y - self.region.y)

    def close(self) -> None:
        """Stop asking."""
        self._accept = None
        self.remove_class("asking", "in-field")
        self.screen.set_focus(None)
        self.say(*self._idle)

    def on_input_submitted(self, event: Input.Submitted) -> None:
        """Offer what was typed to whoever asked."""
        event.stop()
        accept = self._accept
        if accept is None:
            return
        objection = accept(event.value)
        if objection and self._accept is accept:
            self._show_label(f" {objection}  ", "trouble")
        elif self._accept is accept:
            self.close()

    def on_input_changed(self, event: Input.Changed) -> None:
        """Take an objection away as soon as the text is mended."""
        event.stop()
        if self.is_open:
            self._show_label(self._label, "strong")

    def _show_label(self, text: str, role: str) -> None:
        label, room = self.query_one("#prompt-label", Pane), self.size.width
        beside = self.is_open and self._field is None
        width = min(len(text) + 1, max(10, room - LEAST_LINE)) if beside else room
        label.styles.width = width
        if len(text) > room and role == "trouble" and not self.is_open:
            text = text[: room - len(IN_FULL)] + IN_FULL
        label.show([[(text[:width], role)]])
