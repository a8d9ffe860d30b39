"""The design that is being worked on: its past and future, its file, and whether it is saved."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

from tui.session.demo import DEMO_NAME, demo_text
from tui.session.model import ContactEntry, LayerEntry, Session
from tui.session.read import decode, load, read_session
from tui.session.refusal import SessionError
from tui.session.save import save
from tui.session.write import write_session

NEW_SESSION = Session(
    title="",
    left=ContactEntry(material="GaAs"),
    layers=(LayerEntry(material="Al0.3Ga0.7As", thickness_nm=3.0),),
    right=ContactEntry(material="GaAs"),
)
"""What a new design begins as: one barrier."""


@dataclass
class Document:
    """One design with its history; sessions are frozen, so that history costs a pointer a step."""

    session: Session
    path: Path | None = None
    name: str = "new design"
    text: str | None = None
    """The text as it was last read or written; comments are kept from it."""
    saved: Session | None = None
    """The session that the file holds; None where there is no file yet and nothing to lose."""
    past: list[Session] = field(default_factory=list)
    future: list[Session] = field(default_factory=list)

    @property
    def is_changed(self) -> bool:
        """Whether leaving would lose something."""
        return self.session != self.saved

    def become(self, session: Session, *, joins: bool = False) -> None:
        """Take an edit; the one before can be had back, unless this one joins it."""
        if session == self.session:
            return
        if not joins or not self.past or self.session == self.saved:
            self.past.append(self.session)
        self.future.clear()
        self.session = session

    def undo(self) -> bool:
        """Go one edit back; say whether there was one."""
        return self._shift(self.past, self.future)

    def redo(self) -> bool:
        """Go one edit forth; say whether there was one."""
        return self._shift(self.future, self.past)

    def changed_on_disk(self) -> bool:
        """Whether the file holds something else than was last read from it or written to it."""
        if self.path is None or self.text is None:
            return False
        try:
            if not self.path.is_file():  # a pipe would wait for its writer
                return self.path.exists()
            return decode(self.path.read_bytes(), "") != self.text
        except (OSError, SessionError):
            return True

    def would_overwrite(self, path: Path) -> bool:
        """Whether a file holds what was neither read from it nor written to it here."""
        try:
            if self.path is not None and path.exists() and path.samefile(self.path):
                return self.changed_on_disk()
            return path.is_file()
        except (OSError, ValueError):  # saving there will say what is wrong
            return False

    def save_to(self, path: Path) -> None:
        """Write the design to a file and go on with that file.

        Raises
        ------
        SessionError
            It could not be written; nothing changed, here or there.
        """
        text = write_session(self.session, self.text)
        save(path, text, files_only=True)
        self.path, self.name, self.text, self.saved = path, path.name, text, self.session

    def _shift(self, source: list[Session], target: list[Session]) -> bool:
        if not source:
            return False
        target.append(self.session)
        self.session = source.pop()
        return True


def named(text: str) -> Path:
    """Read a path as it was typed, ``~`` for the user's own folder.

    Raises
    ------
    SessionError
        There is no such user, or no name at all.
    """
    name = text.strip()
    if not name:
        raise SessionError("", "a file name is needed", "type one, or leave with Escape")
    try:
        return Path(name).expanduser()
    except RuntimeError as error:
        allowed = "write the path out"
        raise SessionError("", "there is no such user", allowed, source=name) from error


def opened(path: Path) -> Document:
    """Open a file.

    Raises
    ------
    SessionError
        It cannot be read.
    """
    text, session = load(path)
    return Document(session, path, path.name, text, session)


def demo() -> Document:
    """Open the demo design, which belongs to no file."""
    text = demo_text()
    session = read_session(text, DEMO_NAME)
    return Document(session, None, f"{DEMO_NAME} (demo)", text, session)


def fresh() -> Document:
    """Begin a new design."""
    return Document(NEW_SESSION, saved=NEW_SESSION)
