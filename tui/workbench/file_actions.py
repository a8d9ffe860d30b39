"""What keys do with files, history and screens."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from tui.session.refusal import SessionError
from tui.workbench import document as documents
from tui.workbench.bench import Bench
from tui.workbench.document import Document
from tui.workbench.keys import help_lines
from tui.workbench.panes import Pane
from tui.workbench.screens import Reader


class FileActions(Bench):
    """Actions on the design as a whole."""

    def action_undo(self) -> None:
        """Undo."""
        self._history(self.document.undo(), "nothing to undo")

    def action_redo(self) -> None:
        """Redo."""
        self._history(self.document.redo(), "nothing to redo")

    def action_save(self) -> None:
        """Save to the design's file; ask for one where there is none."""
        self._save_and(lambda: None)

    def action_save_as(self) -> None:
        """Save under another name."""
        self._save_as_and(lambda: None)

    def action_open(self) -> None:
        """Open a file."""

        def accept(text: str) -> str:
            try:
                document = documents.opened(documents.named(text))
            except SessionError as error:
                return str(error)
            self._show(document)
            return ""

        self._guarded("open another design", lambda: self.ask("open:", "", accept))

    def action_new(self) -> None:
        """Begin a new design."""
        self._guarded("begin a new design", lambda: self._show(documents.fresh()))

    def action_leave(self) -> None:
        """Quit."""
        self._guarded("quit", lambda: self.exit(0))

    def action_help(self) -> None:
        """List all keys."""
        self.push_screen(Reader("Keys", "\n".join(help_lines())))

    def action_notes(self) -> None:
        """Show the notes in full."""
        title, lines = self.notes_in_full()
        self.push_screen(Reader(title, "\n".join(lines) or "none"))

    def action_redraw(self) -> None:
        """Draw the whole screen anew."""
        self.show_all()
        for pane in self.query(Pane):
            pane.refresh()
        self.screen.refresh(layout=True)

    def _history(self, moved: bool, otherwise: str) -> None:
        if moved:
            self.session_changed()
            self.say("")
        else:
            self.say(otherwise)

    def _guarded(self, what: str, then: Callable[[], object]) -> None:
        """Do what would lose unsaved work only after asking."""
        if not self.document.is_changed:
            then()
            return
        answers = {"s": "save first", "d": f"{what}, the changes are lost"}
        self.choose(
            f"{self.document.name} has unsaved changes.",
            answers,
            lambda key: self._save_and(then) if key == "s" else then(),
        )

    def _save_and(self, then: Callable[[], object]) -> None:
        """Save, and go on once that is done; what another program wrote is asked about."""
        path = self.document.path
        if path is None:
            self._save_as_and(then)
        elif self.document.changed_on_disk():
            self.choose(
                f"{path.name} was changed by another program since it was read here.",
                {"o": "overwrite it", "a": "save under another name"},
                lambda key: self._write(path, then) if key == "o" else self._save_as_and(then),
            )
        else:
            self._write(path, then)

    def _save_as_and(self, then: Callable[[], object]) -> None:
        initial = str(self.document.path or "design.toml")
        self.ask("save as:", initial, lambda text: self._take_name(text, then))

    def _take_name(self, text: str, then: Callable[[], object]) -> str:
        """Save under a name that was typed; give an objection where that cannot be."""
        try:
            path = documents.named(text)
        except SessionError as error:
            return str(error)
        if not self.document.would_overwrite(path):
            return self._write(path, then)
        self.choose(
            f"{path.name} exists already.",
            {"o": "overwrite it"},
            lambda _: self._write(path, then),
        )
        return ""

    def _write(self, path: Path, then: Callable[[], object]) -> str:
        """Write the design to a file and go on, or say and give the objection."""
        try:
            self.document.save_to(path)
        except SessionError as error:
            self.say(str(error), "trouble")
            return str(error)
        self.show_title()
        self.say(f"saved {path}", "strong")
        then()
        return ""

    def _show(self, document: Document) -> None:
        self.document = document
        self.take_document()
