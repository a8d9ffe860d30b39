"""Screens over the workbench: a text to read, and a question with a few answers."""

from __future__ import annotations

from textual import events
from textual.app import ComposeResult
from textual.binding import Binding
from textual.containers import Vertical, VerticalScroll
from textual.screen import ModalScreen
from textual.widgets import Static


class Reader(ModalScreen[None]):
    """A text to read, scrolled by the arrow keys; any of the keys below closes it."""

    BINDINGS = [  # noqa: RUF012  Textual's way
        Binding("escape,q,enter,question_mark,i,f1", "dismiss", show=False),
        Binding("down,j", "scroll(1)", show=False),
        Binding("up,k", "scroll(-1)", show=False),
        Binding("pagedown,space", "scroll(10)", show=False),
        Binding("pageup", "scroll(-10)", show=False),
    ]

    def __init__(self, title: str, text: str) -> None:
        super().__init__()
        self._title, self._text = title, text

    def compose(self) -> ComposeResult:
        """Lay out title, text and the way out."""
        with Vertical(id="reader"):
            yield Static(self._title, id="reader-title", markup=False)
            with VerticalScroll(id="reader-scroll"):
                yield Static(self._text, markup=False)
            yield Static("Esc closes, arrows scroll", id="reader-foot", markup=False)

    def action_scroll(self, lines: int) -> None:
        """Scroll the text."""
        self.query_one("#reader-scroll").scroll_relative(y=lines, animate=False)


class Question(ModalScreen[str]):
    """A question answered by one key; Escape answers with nothing."""

    def __init__(self, question: str, answers: dict[str, str]) -> None:
        super().__init__()
        self._question, self._answers = question, answers

    def compose(self) -> ComposeResult:
        """Lay out the question and its answers."""
        with Vertical(id="question"):
            yield Static(self._question, markup=False)
            for key, meaning in self._answers.items():
                yield Static(f"  {key}    {meaning}", markup=False)
            yield Static("  Esc  stay", markup=False)

    def on_key(self, event: events.Key) -> None:
        """Answer."""
        event.stop()
        if event.key == "escape":
            self.dismiss("")
        elif event.character in self._answers:
            self.dismiss(event.character)
