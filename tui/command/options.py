"""The options that commands share, and what they share in doing."""

from __future__ import annotations

import argparse
import contextlib
import sys
from argparse import ArgumentParser, Namespace
from collections.abc import Callable, Iterable
from dataclasses import replace
from pathlib import Path

from physics import ranges
from physics.ranges import Range
from tui.diagnostics import DONE, INACCURATE, CallError, say
from tui.report.objects import Object, document
from tui.session import tables
from tui.session.model import Session
from tui.session.read import MAX_BYTES, decode, load, read_session
from tui.session.refusal import SessionError, printable
from tui.session.save import save_parts
from tui.study import Request, Scene, Study

STANDARD_INPUT = "standard input"
NUMBERS = ("--from", "--to", "--energy", "--bias", "--temperature", "--max-width")
"""Options whose value may begin with a minus sign."""


def number_in(allowed: Range) -> Callable[[str], float]:
    """Give a converter that argparse can use: a number in a range."""

    def convert(text: str) -> float:
        try:
            value = float(text)
        except ValueError:
            value = float("nan")
        if not allowed.holds(value):
            raise argparse.ArgumentTypeError(f"{printable(text)!r} is refused: {allowed.allowed}")
        return value

    return convert


def count_up_to(most: int) -> Callable[[str], int]:
    """Give a converter for a whole number from 1 on."""

    def convert(text: str) -> int:
        value = int(text) if text.isascii() and text.isdigit() and len(text) <= 12 else 0
        if not 1 <= value <= most:
            allowed = f"a whole number from 1 to {most}"
            raise argparse.ArgumentTypeError(f"{printable(text)!r} is refused: {allowed}")
        return value

    return convert


def add_common(parser: ArgumentParser) -> None:
    """Add FILE and the options that every command takes."""
    parser.add_argument("file", metavar="FILE", help="session text; - for standard input")
    parser.add_argument(
        "--bias", metavar="V", type=number_in(ranges.BIAS_V), help="override the bias, in V"
    )
    parser.add_argument(
        "--temperature",
        metavar="K",
        type=number_in(ranges.TEMPERATURE_K),
        help="override the temperature, in K",
    )
    parser.add_argument("--json", action="store_true", help="one JSON object instead of a table")
    parser.add_argument("-o", dest="output", metavar="PATH", help="write to a file")


def add_window(parser: ArgumentParser, *, max_width: bool) -> None:
    """Add the energy window."""
    energy = number_in(tables.ENERGY_EV)
    parser.add_argument(
        "--from", dest="from_eV", metavar="E", type=energy, help="window's lower end, in eV"
    )
    parser.add_argument(
        "--to", dest="to_eV", metavar="E", type=energy, help="window's upper end, in eV"
    )
    if max_width:
        parser.add_argument(
            "--max-width",
            dest="max_width_eV",
            metavar="W",
            type=number_in(tables.WIDTH_EV),
            help="broadest level of interest, in eV",
        )


def request_of(options: Namespace) -> Request:
    """Read the session that a command names, with its overrides.

    Raises
    ------
    SessionError
        The file is refused.
    CallError
        The result would take the file's place.
    """
    _require_other_output(options)
    options.text, session = read(options.file)
    conditions = session.conditions
    if options.bias is not None:
        conditions = replace(conditions, bias_V=options.bias)
    if options.temperature is not None:
        conditions = replace(conditions, temperature_K=options.temperature)
    return Request(
        replace(session, conditions=conditions),
        getattr(options, "from_eV", None),
        getattr(options, "to_eV", None),
        getattr(options, "max_width_eV", None),
    )


def _require_other_output(options: Namespace) -> None:
    """Refuse to put a result where the session text is: nothing that was typed may be lost."""
    for option, name in (("-o", options.output), ("--each", getattr(options, "each", None))):
        if "-" in (options.file, name) or name is None:
            continue
        with contextlib.suppress(
            OSError, ValueError
        ):  # what cannot be found is refused where it is used
            if Path(name).is_file() and Path(name).samefile(options.file):
                said = f"{option} names the session text itself, {printable(options.file)}"
                raise CallError(f"{said}; name another file")


def read(file: str) -> tuple[str, Session]:
    """Read a session, text and meaning, from a file or from standard input."""
    if file != "-":
        return load(Path(file))
    if sys.stdin is None:
        raise CallError("standard input is closed; name a file instead of -")
    try:
        data = sys.stdin.buffer.read(MAX_BYTES + 1)
    except OSError as error:
        reason = (error.strerror or str(error)).lower()
        raise SessionError("", "it cannot be read", reason, source=STANDARD_INPUT) from error
    text = decode(data, STANDARD_INPUT)
    return text, read_session(text, STANDARD_INPUT)


def source_of(file: str) -> str:
    """Name a session's source for the reader."""
    return STANDARD_INPUT if file == "-" else printable(file)


def locate(options: Namespace, error: SessionError) -> SessionError:
    """Give a refusal that came after reading its place in the text."""
    return error if error.source else error.located(options.text, source_of(options.file))


def put(options: Namespace, text: str) -> None:
    """Write a result to where the call wants it."""
    put_parts(options, [text])


def put_parts(options: Namespace, parts: Iterable[str]) -> None:
    """Write a result that comes in parts to where the call wants it."""
    if options.output not in (None, "-"):
        save_parts(Path(options.output), parts)
    elif sys.stdout is None:
        raise CallError("standard output is closed; name a file with -o")
    else:
        sys.stdout.writelines(parts)


def put_either(options: Namespace, session: Session, table: str, content: Object) -> None:
    """Write a result as a table, or as JSON where that is asked for."""
    put(options, document(options.command, session, content) if options.json else table)


def say_notes(study: Study) -> None:
    """Say the notes of an answer beside a table, which has no room for them."""
    for note in study.advice:
        say(f"note: {note.topic}: {note.text}")


def status_of_field(scene: Scene) -> int:
    """Say whether the field under an answer converged, also in words where it did not."""
    screening = scene.screening
    if screening is None or screening.converged:
        return DONE
    say(f"note: screening: the field did not converge: {screening.reason}")
    return INACCURATE


def status_of(study: Study) -> int:
    """Say whether the answer reached what it states."""
    return DONE if study.reached else INACCURATE
