"""The lowest line: a hint or a message, or a field that is being typed into."""

from __future__ import annotations

from collections.abc import Callable

from textual.app import ComposeResult
from textual.binding import Binding
from textual.containers import Horizontal
from textual.widgets import Input

from tui.workbench.panes import Pane

Accept = Callable[[str], str]
"""Takes what was typed; an empty answer means that it was taken, another says why not."""


class TypedLine(Input):
    """A line to type into; Escape gives up, and what is refused stays to be mended."""

    BINDINGS = [Binding("escape", "give_up", show=False)]  # noqa: RUF012  Textual's way

    def action_give_up(self) -> None:
        """Close the line without taking what it holds."""
        prompt = self.parent
        if isinstance(prompt, Prompt):
            prompt.close()


class Prompt(Horizontal):
    """Shows a message; asks for a line of text when it has to."""

    def __init__(self, *, id: str) -> None:  # noqa: A002
        super().__init__(id=id)
        self._accept: Accept | None = None
        self._label = ""
        self._idle = ("", "faint")

    def compose(self) -> ComposeResult:
        """Lay out label, line and remark."""
        yield Pane(id="prompt-label")
        yield TypedLine(id="prompt-line", compact=True, select_on_focus=False)

    @property
    def is_open(self) -> bool:
        """Whether a line is being typed."""
        return self._accept is not None

    def say(self, text: str, role: str = "faint") -> None:
        """Show a message where no line is being typed."""
        self._idle = (text, role)
        if not self.is_open:
            self._show_label(text, role, wide=True)

    def ask(self, label: str, initial: str, accept: Accept) -> None:
        """Ask for a line of text."""
        self._accept, self._label = accept, label
        self.add_class("asking")
        self._show_label(label, "strong", wide=False)
        line = self.query_one(TypedLine)
        line.value = initial
        line.cursor_position = len(initial)
        line.focus()

    def close(self) -> None:
        """Stop asking."""
        self._accept = None
        self.remove_class("asking")
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
            self._show_label(f"{objection}  ", "trouble", wide=False)
        elif self._accept is accept:
            self.close()

    def on_input_changed(self, event: Input.Changed) -> None:
        """Take an objection away as soon as the text is mended."""
        event.stop()
        if self.is_open:
            self._show_label(self._label, "strong", wide=False)

    def _show_label(self, text: str, role: str, *, wide: bool) -> None:
        label = self.query_one("#prompt-label", Pane)
        room = self.size.width
        width = room if wide else min(len(text) + 1, max(10, room - 16))
        label.styles.width = width
        label.show([[(text[:width], role)]])
