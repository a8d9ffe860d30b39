"""Asking and telling: the lowest line, questions, and what has precedence there."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from textual.geometry import Region

from tui.workbench.keys import KeysInTurn
from tui.workbench.prompt import Accept, Prompt
from tui.workbench.screens import Question


class Asking(KeysInTurn[int], inherit_bindings=False):
    """What the workbench asks its user, and tells."""

    def __init__(self) -> None:
        super().__init__()
        self.trouble = ""
        self.field_region = Region(0, 0, 0, 0)

    def say(self, text: str, role: str = "faint") -> None:
        """Show a message on the lowest line; a design that does not compute has precedence."""
        if self.trouble and role == "faint":
            text, role = self.trouble, "trouble"
        self.query_one("#prompt", Prompt).say(f" {text}", role)

    def ask(self, label: str, initial: str, accept: Accept, *, in_form: bool = False) -> None:
        """Ask for a line of text, on the lowest line or in the form at the cursor."""
        field = self.field_region if in_form else None
        self.query_one("#prompt", Prompt).ask(f" {label} ", initial, accept, field)

    def choose(self, question: str, answers: dict[str, str], then: Callable[[str], Any]) -> None:
        """Ask a question; ``then`` is called with the key of an answer, unless it is left."""
        self.push_screen(Question(question, answers), lambda key: then(key) if key else None)

    @property
    def is_asking(self) -> bool:
        """Whether a line of text is being typed."""
        return self.query_one("#prompt", Prompt).is_open
