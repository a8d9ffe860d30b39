"""What may import what, and the manners of the code; checked where it can be."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

TOP = Path(__file__).parents[1]
PHYSICS = sorted((TOP / "physics").glob("*.py"))
SOURCES = sorted([*PHYSICS, *(TOP / "tui").rglob("*.py")])
LONGEST = 300
HEAVY = ("textual", "rich", "scipy", "tomlkit", "plotext")


def test_imports_point_downward() -> None:
    """The contracts in pyproject.toml are exhaustive: a new module has to be listed."""
    program = "from importlinter.cli import lint_imports; import sys; sys.exit(lint_imports())"
    done = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=False, cwd=TOP
    )
    assert done.returncode == 0, done.stdout + done.stderr


@pytest.mark.parametrize("arguments", [["levels", "-"], ["report", "-"], ["example"], ["--help"]])
def test_the_command_line_loads_nothing_heavy(arguments: list[str]) -> None:
    program = (
        "import sys; from tui.command.entry import main; "
        f"status = main({arguments!r}); "
        f"loaded = [name for name in {HEAVY!r} if name in sys.modules]; "
        "print(loaded, file=sys.stderr); sys.exit(status or bool(loaded))"
    )
    text = (TOP / "tui" / "session" / "demo.toml").read_bytes()
    done = subprocess.run(
        [sys.executable, "-c", program], input=text, capture_output=True, check=False, cwd=TOP
    )
    assert done.returncode == 0, done.stderr


@pytest.mark.parametrize("path", PHYSICS, ids=lambda path: path.stem)
def test_physics_is_silent_and_reads_only_its_own_data(path: Path) -> None:
    called = {
        node.func.id if isinstance(node.func, ast.Name) else getattr(node.func, "attr", "")
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8")))
        if isinstance(node, ast.Call)
    }
    reading = {"read_text", "read_bytes", "open"} if path.stem != "catalogue" else {"open"}
    assert not called & {"print", "input", "exec", "eval", *reading}


@pytest.mark.parametrize("path", SOURCES, ids=lambda path: str(path.relative_to(TOP)))
def test_a_file_can_be_held_in_mind(path: Path) -> None:
    assert len(path.read_text(encoding="utf-8").splitlines()) <= LONGEST


@pytest.mark.parametrize("path", SOURCES, ids=lambda path: str(path.relative_to(TOP)))
def test_nothing_is_caught_blindly(path: Path) -> None:
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.ExceptHandler):
            caught = ast.unparse(node.type) if node.type else ""
            assert caught not in ("", "Exception", "BaseException")
