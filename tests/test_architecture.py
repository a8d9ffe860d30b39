"""What may import what, and the manners of the code; checked where it can be."""

from __future__ import annotations

import ast
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

TOP = Path(__file__).parents[1]
PHYSICS = sorted((TOP / "physics").glob("*.py"))
SOURCES = sorted([*PHYSICS, *(TOP / "tui").rglob("*.py")])
LONGEST = 300
LONGEST_FUNCTION = 40
HEAVY = ("textual", "rich", "scipy", "tomlkit", "plotext")


def lint(folder: Path) -> str:
    """Hold the contracts against a checkout; give what is broken."""
    program = "import sys; from importlinter.cli import lint_imports as lint; sys.exit(lint())"
    done = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=False, cwd=folder
    )
    return "" if done.returncode == 0 else done.stdout + done.stderr


def test_imports_point_downward() -> None:
    """The contracts in pyproject.toml are exhaustive: a new module has to be listed."""
    assert not lint(TOP)


@pytest.mark.parametrize(
    ("module", "text", "said"),
    [
        ("physics/stray.py", "", "stray"),
        ("tui/session/stray.py", "", "stray"),
        ("physics/errors.py", "import physics.levels\n", "physics in layers BROKEN"),
        ("physics/advice.py", "import tui.session.model\n", "front ends BROKEN"),
        ("tui/command/levels.py", "import rich\n", "at one door BROKEN"),
        ("tui/study.py", "import textual\n", "needs Textual BROKEN"),
    ],
)
def test_what_the_contracts_are_for_breaks_them(
    module: str, text: str, said: str, tmp_path: Path
) -> None:
    for name in ("physics", "tui", "pyproject.toml"):
        (tmp_path / name).parent.mkdir(exist_ok=True)
        copy = shutil.copytree if (TOP / name).is_dir() else shutil.copy
        copy(TOP / name, tmp_path / name)
    with (tmp_path / module).open("a", encoding="utf-8") as file:
        file.write(text)
    assert said in lint(tmp_path)


@pytest.mark.parametrize(
    "arguments",
    [
        ["levels", "-"],
        ["spectrum", "-"],
        ["profile", "-"],
        ["report", "-"],
        ["example"],
        ["--help"],
    ],
)
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
def test_a_function_can_be_held_in_mind(path: Path) -> None:
    """Its docstring apart, which is for others to read."""
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, (ast.FunctionDef, ast.AsyncFunctionDef)):
            first = node.body[1] if ast.get_docstring(node) and node.body[1:] else node.body[0]
            assert (node.end_lineno or 0) - first.lineno < LONGEST_FUNCTION, node.name


@pytest.mark.parametrize("path", SOURCES, ids=lambda path: str(path.relative_to(TOP)))
def test_nothing_is_caught_blindly(path: Path) -> None:
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.ExceptHandler):
            caught = ast.unparse(node.type) if node.type else ""
            assert caught not in ("", "Exception", "BaseException")
