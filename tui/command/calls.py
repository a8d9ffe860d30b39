"""What a call of ``winze`` means, and who answers it."""

from __future__ import annotations

import argparse
import sys
from typing import Any, NoReturn

from tui.command import example, iv, levels, profile, report, spectrum, tolerance
from tui.command.options import NUMBERS, locate
from tui.command.workbench import open_workbench
from tui.diagnostics import WRONG, CallError
from tui.session.refusal import SessionError

VERSION = "0.1.0"
COMMANDS = (levels, spectrum, profile, iv, tolerance, report, example)
DESCRIPTION = """\
Design layered tunnelling structures: where the levels are, how long they live,
what gets through, what current flows.

  winze                       open the workbench on the demo design
  winze FILE                  open the workbench on a session text
  winze COMMAND FILE ...      answer on standard output and leave
"""
EPILOG = """\
examples:
  winze example -o diode.toml
  winze diode.toml
  winze levels diode.toml --bias 0.12
  winze spectrum diode.toml --from 0 --to 0.4 --points 2000 > t.csv
  winze profile diode.toml --level 2 --json | jq .norm
  winze iv diode.toml --from 0 --to 0.5 -o iv.csv
  winze tolerance diode.toml --draws 2048 --seed 7
  sed 's/= 10$/= 11/' diode.toml | winze report -

exit status: 0 done, 1 a check failed, 2 wrong input or call,
3 stated accuracy not reached (what there is, is printed), 130 interrupted
"""


class Parser(argparse.ArgumentParser):
    """A parser whose refusals go the way of all others.

    It takes no shortened options: a script that used one would break when an option is added.
    """

    def __init__(self, **settings: Any) -> None:
        super().__init__(allow_abbrev=False, **settings)

    def error(self, message: str) -> NoReturn:
        """Refuse a call."""
        name = self.prog.removeprefix("winze").strip()
        said = f"{name}: {message}" if name else message
        raise CallError(f"{said}; {self.prog} --help says what is taken")


def answer(arguments: list[str]) -> int:
    """Answer a call.

    Raises
    ------
    CallError, SessionError, PhysicsError
        It cannot be answered.
    """
    for stream in (sys.stdout, sys.stderr):
        # A locale without the characters of a title must not stop a result.
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")
    if not arguments or (len(arguments) == 1 and _names_a_file(arguments[0])):
        return open_workbench(arguments[0] if arguments else None)
    try:
        options = parser().parse_args(_joined(arguments))
    except SystemExit as leaving:  # argparse has printed help or the version
        return leaving.code if isinstance(leaving.code, int) else WRONG
    try:
        status: int = options.run(options)
    except SessionError as error:
        raise locate(options, error) from error
    return status


def parser() -> Parser:
    """Build the parser of all commands."""
    top = Parser(
        prog="winze",
        description=DESCRIPTION,
        epilog=EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    top.add_argument("--version", action="version", version=f"winze {VERSION}")
    commands = top.add_subparsers(dest="command", metavar="COMMAND", required=True)
    for command in COMMANDS:
        command.add(commands)
    return top


def _names_a_file(argument: str) -> bool:
    names = {command.__name__.rpartition(".")[2] for command in COMMANDS}
    return not argument.startswith("-") and argument not in names


def _joined(arguments: list[str]) -> list[str]:
    """Join an option and a negative number: argparse takes ``-1e-3`` for an option."""
    joined: list[str] = []
    for argument in arguments:
        if joined and joined[-1] in NUMBERS and argument.startswith("-"):
            joined[-1] += f"={argument}"
        else:
            joined.append(argument)
    return joined
