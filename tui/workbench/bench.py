"""The bench: the design in hand, its answer, and the panes that show both.

Actions live in modules of their own (`form_actions`, `energy_actions`, `file_actions`) on top of
this class; what they decide is decided by pure functions.
"""

from __future__ import annotations

import time
from typing import ClassVar

from textual import events
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Container
from textual.geometry import Region
from textual.message import Message
from textual.timer import Timer

from physics.errors import PhysicsError
from physics.structure import Structure
from tui.figures.cells import PLAIN, Glyphs
from tui.reading import Reading
from tui.session.model import Session
from tui.session.refusal import SessionError
from tui.session.resolve import resolve
from tui.study import Request, Study
from tui.workbench.asking import Asking
from tui.workbench.document import Document
from tui.workbench.form import Field, Row, rows_of
from tui.workbench.keys import KEYS
from tui.workbench.panes import CurrentPane, FigurePane, Pane
from tui.workbench.prompt import Prompt
from tui.workbench.readout import dimmed, level_lines, note_lines, reading_lines, standing, wrapped
from tui.workbench.sheet import Cursor, field_at, field_place, moved, sheet_height, sheet_lines
from tui.workbench.solver import Hand, Outcome, Solver, Task

NOTE_WIDTH = 70
WIDE_FROM, SMALLEST = (160, 30), (60, 18)
RESIZE_PAUSE_S = 0.08
SLOW_S, PROGRESS_S = 0.3, 1.0
"""When a computation is called slow, and how often its time is shown."""
HINT = "? keys  Enter change  + - step  n p level  a d x layer  c view  w save  q quit"


class Bench(Asking, inherit_bindings=False):
    """State and panes of the workbench."""

    CSS_PATH = "bench.tcss"
    ENABLE_COMMAND_PALETTE = False
    AUTO_FOCUS = None
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding(key.keys, key.action, key.text, show=False) for key in KEYS
    ]

    class Answered(Message):
        """The solver has an outcome."""

        def __init__(self, outcome: Outcome) -> None:
            super().__init__()
            self.outcome = outcome

    def __init__(self, document: Document, glyphs: Glyphs) -> None:
        super().__init__()
        self.document = document
        self.glyphs = glyphs
        self.cursor = Cursor()
        self.hand = Hand()
        self.structure: Structure | None = None
        self.shows_current = False
        self.rows: list[Row] = rows_of(document.session, None)
        self.study: Study | None = None
        self.reading: Reading | None = None
        self.asked: Task | None = None
        self._due: Task | None = None
        self._asked_at = 0.0
        self._form_height = 0
        self._resizing: Timer | None = None
        self._progressing: Timer | None = None
        self.solver = Solver(self._deliver)

    def compose(self) -> ComposeResult:
        """Lay out the panes."""
        yield Pane(id="title")
        with Container(id="body"):
            with Container(id="answer"):
                yield FigurePane(self.glyphs, id="figure")
                yield CurrentPane(self.glyphs, id="current")
                yield Pane(id="reading")
            with Container(id="side"):
                yield Pane(id="sheet")
                yield Pane(id="levels")
                yield Pane(id="notes")
        yield Pane(id="small")
        yield Prompt(id="prompt")

    def on_mount(self) -> None:
        """Begin with what was opened."""
        if self.glyphs is PLAIN:
            self.add_class("plain")
        self.call_after_refresh(self.take_document)

    def on_unmount(self) -> None:
        """End the computing thread."""
        self.solver.close()

    # What is on the bench

    @property
    def session(self) -> Session:
        """The session as it is now."""
        return self.document.session

    @property
    def field(self) -> Field:
        """The field at the form's cursor."""
        return field_at(self.cursor, self.rows)

    def take_document(self) -> None:
        """Show a document that was just opened or begun."""
        self.hand = Hand()
        self.session_changed()
        self.say(HINT)

    def become(self, session: Session) -> None:
        """Take an edit."""
        self.document.become(session)
        self.session_changed()

    def session_changed(self) -> None:
        """Resolve what is there now, show the form at once, and ask for the answer."""
        try:
            self.structure, trouble = resolve(self.session), ""
        except (SessionError, PhysicsError) as error:
            self.structure, trouble = None, str(error)
        self._take_trouble(trouble)
        self.lay_form()
        self.show_form()
        self.compute()

    def lay_form(self) -> None:
        """Lay the form out for what is there now and for the view."""
        self.rows = rows_of(self.session, self.structure, of_current=self.shows_current)
        self.cursor = moved(self.cursor, self.rows, 0, 0)

    def compute(self) -> None:
        """Ask for the answer to what is there now, once all keys that have come are acted on."""
        self.asked = self._due = Task(Request(self.session), self.hand)
        self._asked_at = time.monotonic()
        if not self.are_keys_waiting:
            self.all_keys_done()

    def all_keys_done(self) -> None:
        """Compute what was asked for last."""
        task, self._due = self._due, None
        if task is None:
            return
        outcome = self.solver.answer_at_once(task)
        if outcome is None:
            self.solver.ask(task)
            self.show_title()
            self._progress_after(SLOW_S)
        else:
            self._take(outcome)

    def on_bench_answered(self, message: Answered) -> None:
        """Show an outcome that came from the thread."""
        self._take(message.outcome)

    def _take(self, outcome: Outcome) -> None:
        """Show an outcome, unless something newer has been asked for."""
        if outcome.task is not self.asked or not self.is_running:
            return
        self.asked = None
        self._take_trouble(outcome.trouble)
        if outcome.study is not None:
            self.study, self.reading = outcome.study, outcome.reading
        self.show_answer()

    def _take_trouble(self, trouble: str) -> None:
        """Say why a design does not compute, and say no more once it does again."""
        if trouble != self.trouble:
            self.trouble = trouble
            self.say(HINT)

    def _deliver(self, outcome: Outcome) -> None:
        # Called in the solver's thread; posting is what a thread may do.
        self.post_message(self.Answered(outcome))

    # Showing

    def show_form(self) -> None:
        """Show the form."""
        pane = self.query_one("#sheet", Pane)
        self._fit_form(pane)
        width, height = pane.content_size
        if not width or not height:
            return
        lines = sheet_lines(self.rows, self.cursor, width, height)
        pane.show(lines)
        place = field_place(lines)
        if place is not None:
            line, column, wide = place
            at = pane.content_region
            self.field_region = Region(at.x + column, at.y + line, wide, 1)
            self.query_one("#prompt", Prompt).move_to(self.field_region)

    def _fit_form(self, pane: Pane) -> None:
        """Give the form the height that its rows want, and draw all once that has happened."""
        width = pane.content_size.width or self.size.width
        is_wide = self.has_class("wide")
        height = sheet_height(self.rows, self.size.height, beside=is_wide, width=width)
        if self._form_height != height:
            self._form_height = height
            pane.styles.height = height
            self.call_after_refresh(self.show_all)

    def show_answer(self) -> None:
        """Show figure, read-out, levels and notes."""
        self.show_title()
        study, reading = self.study, self.reading
        if study is None or reading is None:
            self.query_one("#figure", Pane).show([[("", "")], [(f" {self.trouble}", "trouble")]])
            return
        is_old = bool(self.trouble)
        self.query_one("#figure", FigurePane).draw(study, reading, is_old=is_old)
        pane = self.query_one("#reading", Pane)
        lines = reading_lines(study, reading, pane.size.width)
        pane.show(dimmed(lines) if is_old else lines)
        pane = self.query_one("#levels", Pane)
        lines = level_lines(study, reading, pane.content_size.height)
        pane.show(dimmed(lines) if is_old else lines)
        pane = self.query_one("#notes", Pane)
        pane.show(note_lines(self.notes(), pane.content_size.width))

    def notes(self) -> list[str]:
        """Give the notes on the answer."""
        advice = () if self.study is None else self.study.advice
        return [f"{note.topic}: {note.text}" for note in advice]

    def notes_in_full(self) -> tuple[str, list[str]]:
        """Give what there is to read on the answer, under a title."""
        lines = [line for note in self.notes() for line in [*wrapped(note, NOTE_WIDTH), ""]]
        if self.trouble:
            lines = [*wrapped(self.trouble, NOTE_WIDTH), "", *lines]
        return "Notes on this answer", lines

    def show_title(self) -> None:
        """Show what is in hand, and how its answer stands."""
        document, pane = self.document, self.query_one("#title", Pane)
        mark = "*" if document.is_changed else ""
        left = f" {document.name}{mark}  {self.session.title}"
        right = f" {self.answer_state()} "
        room = max(0, pane.size.width - len(right))
        role = "trouble" if self.trouble else "bar"
        pane.show([[(left[:room].ljust(room), "bar"), (right, role)]])

    def answer_state(self) -> str:
        """Say how the answer stands."""
        waited_s = 0.0 if self.asked is None else time.monotonic() - self._asked_at
        return standing(self.study, self.trouble, waited_s if waited_s > SLOW_S else 0.0)

    def _show_progress(self) -> None:
        """Say how long it takes, for as long as it does; nothing ticks otherwise."""
        if self.asked is not None:
            self.show_title()
            self._progress_after(PROGRESS_S)

    def _progress_after(self, seconds: float) -> None:
        if self._progressing is not None:
            self._progressing.stop()
        self._progressing = self.set_timer(seconds, self._show_progress)

    def on_resize(self, event: events.Resize) -> None:
        """Choose the layout; draw once the resizing has paused."""
        width, height = event.size
        self.set_class(width >= WIDE_FROM[0] and height >= WIDE_FROM[1], "wide")
        self.set_class(width < SMALLEST[0] or height < SMALLEST[1], "small")
        if self._resizing is not None:
            self._resizing.stop()
        self._resizing = self.set_timer(RESIZE_PAUSE_S, self.show_all)

    def show_all(self) -> None:
        """Show everything again, unless it is just ending."""
        if not self.is_running:
            return
        width, height = self.size
        need = f"winze needs {SMALLEST[0]} x {SMALLEST[1]} cells; this is {width} x {height}"
        self.query_one("#small", Pane).show([[(need, "strong")]])
        self.show_form()
        self.show_answer()
