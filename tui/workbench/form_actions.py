"""What keys do to the form: move, type, step, and work on layers."""

from __future__ import annotations

from collections.abc import Callable

from textual import events

from physics.ranges import Range
from tui.session.model import Session
from tui.workbench import stacking, values
from tui.workbench.bench import Bench
from tui.workbench.form import NOT_STATED, Field
from tui.workbench.sheet import Cursor, moved
from tui.workbench.typed import Refusal, as_line, from_line, unit_of

FIRST_LAYER_ROW = 2
BEGINS_A_NUMBER = "0123456789."


class FormActions(Bench):
    """Actions on the form."""

    def on_key(self, event: events.Key) -> None:
        """Begin a value with its first digit."""
        character = event.character or ""
        if self.is_asking or len(self.screen_stack) > 1 or character not in BEGINS_A_NUMBER:
            return
        if character and self._is_number(self.field):
            event.stop()
            self._type(self.field, character)

    def action_go(self, down: int, right: int) -> None:
        """Move the cursor."""
        self.cursor = moved(self.cursor, self.rows, down, right)
        self.show_form()
        self.say(self._about(self.field))

    def action_change(self) -> None:
        """Type a value, beginning with the one that is there."""
        field = self.field
        stated = values.value_of(self.session, field.place, field.key)
        if stated is None:
            initial = "" if field.text in ("auto", NOT_STATED) else field.text
        else:
            initial = stated if isinstance(stated, str) else repr(stated)
        self._type(field, initial)

    def action_clear(self) -> None:
        """Empty the field."""
        self._edit(lambda: values.set_typed(self.session, *self._at(), "", self.structure))

    def action_step(self, direction: int) -> None:
        """Step the value."""
        self._step(direction, fine=False)

    def action_fine_step(self, direction: int) -> None:
        """Step the value by less."""
        self._step(direction, fine=True)

    def action_add(self) -> None:
        """Add a layer behind the one at the cursor."""
        at = self._layer_index()
        count = len(self.session.layers)
        after = at if at is not None else (count - 1 if self.field.place[0] == "right" else -1)
        self._edit(lambda: stacking.add_layer(self.session, after))
        self._put_cursor(after + 1)

    def action_duplicate(self) -> None:
        """Duplicate the layer."""
        self._on_layer(lambda at: stacking.duplicate_layer(self.session, at), 1)

    def action_remove(self) -> None:
        """Delete the layer."""
        self._on_layer(lambda at: stacking.delete_layer(self.session, at), 0)

    def action_move(self, by: int) -> None:
        """Move the layer."""
        self._on_layer(lambda at: stacking.move_layer(self.session, at, by), by)

    def action_split(self) -> None:
        """Split the layer."""
        self._on_layer(lambda at: stacking.split_layer(self.session, at, self.structure), 0)

    def action_mirror(self) -> None:
        """Mirror the stack about the layer."""
        self._on_layer(lambda at: stacking.mirror(self.session, at, self.structure), 0)

    def action_turn(self) -> None:
        """Turn the layer's grade round."""
        self._on_layer(lambda at: stacking.turn_layer(self.session, at, self.structure), 0)

    def action_title(self) -> None:
        """Change the title."""
        place = ("top", 0)

        def accept(text: str) -> str:
            return self._try(lambda: values.set_typed(self.session, place, "title", text, None))

        self.ask("title", self.session.title, accept)

    def action_session_notes(self) -> None:
        """Change the design's notes."""
        place = ("top", 0)

        def accept(text: str) -> str:
            return self._try(
                lambda: values.set_value(self.session, place, "notes", from_line(text) or None)
            )

        self.ask("notes", as_line(self.session.notes), accept)

    def _type(self, field: Field, initial: str) -> None:
        def accept(text: str) -> str:
            return self._try(
                lambda: values.set_typed(self.session, field.place, field.key, text, self.structure)
            )

        self.ask(self._about(field), initial, accept, in_form=True)

    def _step(self, direction: int, *, fine: bool) -> None:
        place, key = self._at()
        self._edit(
            lambda: values.step(
                self.session, place, key, direction, fine=fine, structure=self.structure
            )
        )

    def _edit(self, edit: Callable[[], Session]) -> None:
        objection = self._try(edit)
        if objection:
            self.say(objection, "trouble")

    def _try(self, edit: Callable[[], Session]) -> str:
        """Take an edit, or say why not."""
        try:
            session = edit()
        except Refusal as refusal:
            return str(refusal)
        self.become(session)
        if not self.is_asking:
            self.say(self._about(self.field))
        return ""

    def _on_layer(self, edit: Callable[[int], Session], then: int) -> None:
        """Edit the layer at the cursor, which then moves by as many rows."""
        at = self._layer_index()
        if at is None:
            self.say("put the cursor on a layer first", "trouble")
            return
        before = self.session
        self._edit(lambda: edit(at))
        if self.session is not before and then:
            self._put_cursor(at + then)

    def _put_cursor(self, layer: int) -> None:
        self.cursor = Cursor(layer + FIRST_LAYER_ROW, self.cursor.column)
        self.cursor = moved(self.cursor, self.rows, 0, 0)
        self.show_form()

    def _layer_index(self) -> int | None:
        kind, index = self.field.place
        return index if kind == "layer" else None

    def _at(self) -> tuple[values.Place, str]:
        field = self.field
        return field.place, field.key

    @staticmethod
    def _is_number(field: Field) -> bool:
        return isinstance(values.TABLES[field.place[0]][field.key], Range)

    def _label(self, field: Field) -> str:
        kind, index = field.place
        where = {"layer": f"layer {index + 1} ", "left": "left ", "right": "right "}.get(kind, "")
        return f"{where}{field.head}:"

    def _about(self, field: Field) -> str:
        """Say what a field takes."""
        rule = values.TABLES[field.place[0]][field.key]
        allowed = rule.allowed if isinstance(rule, Range) else _TEXT_FIELDS.get(field.key, "a text")
        unit = unit_of(field.key)
        return f"{self._label(field)} {allowed}" + (f"; in {unit}" if unit == "ml" else "")


_TEXT_FIELDS = {
    "label": "a name for the layer",
    "material": "a formula like Al0.3Ga0.7As, or a material of the session's own",
    "to_material": "the material at the right face of a graded layer",
    "substrate": "what the stack is grown on, by its formula, as InP; empty: nothing is strained",
    **{
        key: f"{' or '.join(choices)}; + and - change it" for key, choices in values.CHOICES.items()
    },
}
