"""The command line where its streams, its files or its time end: never a traceback."""

from __future__ import annotations

import os
import stat
import subprocess
import sys
import threading
import tomllib
from pathlib import Path

import pytest

from tui.command.calls import VERSION
from tui.command.entry import main
from tui.session.demo import demo_text
from tui.session.refusal import SessionError
from tui.session.save import save

TOP = Path(__file__).parents[2]
WINZE = f"{sys.executable} -m tui.command.entry"


def shell(command: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        ["bash", "-c", command.replace("winze", WINZE, 1)],
        input=demo_text(),
        capture_output=True,
        text=True,
        check=False,
        cwd=TOP,
        timeout=60,
    )


@pytest.mark.parametrize(
    ("command", "status", "said"),
    [
        ("winze levels - >&-", 2, "standard output is closed"),
        ("winze levels - <&-", 2, "standard input is closed"),
        ("winze levels - > /dev/full", 2, "no space left"),
        ("winze levels - --json > /dev/full", 2, "no space left"),
        ("winze levels - -o /dev/full", 2, "/dev/full: it cannot be written; no space left"),
        ("winze levels - --temp 77", 2, "unrecognized arguments: --temp 77"),
        ("winze levels - $'--x\\e[2J'", 2, "\\x1b[2J"),
        ("winze levls -", 2, "'levls'"),
        ("winze -", 2, "winze --help"),
        ("winze levels", 2, "FILE"),
        ("winze <&-", 2, "the workbench needs a terminal"),
        ("winze >&-", 2, "the workbench needs a terminal"),
        ("winze a.toml <&- >&-", 2, "the workbench needs a terminal"),
        ("winze ivy - --from 0 --to 1 --points 3", 2, "'ivy'"),
        ("winze levels - -o /dev/null/x", 2, "it cannot be written; not a directory"),
    ],
)
def test_what_ends_early(command: str, status: int, said: str) -> None:
    done = shell(command)
    assert done.returncode == status
    assert said in done.stderr.replace("No space", "no space")
    assert done.stderr.startswith("winze: ")
    assert done.stderr.count("\n") == 1
    assert "\x1b" not in done.stderr
    assert done.stdout == ""


@pytest.mark.parametrize("command", ["winze levels - 2>&-", "winze levels - 2> >(exec true)"])
def test_a_result_is_not_lost_where_nobody_hears_the_notes(command: str) -> None:
    done = shell(command)
    assert done.returncode == 0
    assert done.stdout.startswith("level,energy_eV,")
    assert len(done.stdout.splitlines()) == 3


def test_a_device_is_written_to_and_stays_a_device() -> None:
    done = shell("winze levels - -o /dev/stdout | cat")
    assert done.stdout.startswith("level,energy_eV,")
    assert main(["example", "-o", os.devnull]) == 0
    assert stat.S_ISCHR(Path(os.devnull).stat().st_mode)


def test_a_pipe_with_a_name_is_written_to(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    read: list[str] = []
    reader = threading.Thread(target=lambda: read.append(pipe.read_text(encoding="utf-8")))
    reader.start()
    save(pipe, "x = 1\n")
    reader.join(timeout=10)
    assert read == ["x = 1\n"]
    assert stat.S_ISFIFO(pipe.stat().st_mode)


def test_an_interrupted_save_leaves_nothing_behind(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def interrupted(_: int) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(os, "fsync", interrupted)
    with pytest.raises(KeyboardInterrupt):
        save(tmp_path / "a.toml", "x = 1\n")
    assert list(tmp_path.iterdir()) == []


def test_links_in_a_circle(tmp_path: Path) -> None:
    one, other = tmp_path / "one", tmp_path / "other"
    one.symlink_to(other)
    other.symlink_to(one)
    with pytest.raises(SessionError, match="cannot be written"):
        save(one, "x = 1\n")


@pytest.mark.parametrize("module", ["tui.diagnostics", "tomllib", "argparse", "physics.levels"])
def test_an_interrupt_at_any_moment_is_answered_in_one_line(module: str) -> None:
    """The signal arrives while modules are being loaded, which is held back until they are."""
    program = (
        "import os, signal, sys\n"
        "signal.signal(signal.SIGINT, signal.default_int_handler)\n"
        "class Signalling:\n"
        "    def find_spec(self, name, path=None, target=None):\n"
        f"        if name == {module!r}:\n"
        "            os.kill(os.getpid(), signal.SIGINT)\n"
        "sys.meta_path.insert(0, Signalling())\n"
        "from tui.command.entry import main\n"
        "sys.exit(main())\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", program, "levels", "-"],
        input=demo_text(),
        capture_output=True,
        text=True,
        check=False,
        cwd=TOP,
        timeout=60,
    )
    assert (done.returncode, done.stdout, done.stderr) == (130, "", "winze: interrupted\n")


@pytest.mark.parametrize("value", ["0x" + "f" * 6000, "[0x" + "f" * 6000 + "]", "1" * 5000])
def test_a_number_that_python_will_not_write(
    value: str, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    path = tmp_path / "x.toml"
    path.write_text(demo_text().replace("= 22", f"= {value}"))
    assert main(["levels", str(path)]) == 2
    assert "x.toml" in capsys.readouterr().err


def test_the_version_is_the_distribution_s() -> None:
    project = tomllib.loads((TOP / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    assert project["version"] == VERSION


@pytest.mark.skipif(not Path("/proc/self/task").is_dir(), reason="counts threads by /proc")
def test_products_stay_on_one_thread() -> None:
    """Several would wait for each other, five times as long where cores are shared."""
    program = (
        "import os\n"
        "from tui.command.entry import main\n"
        "assert main(['levels', '-', '-o', os.devnull]) == 0\n"
        "print(len(os.listdir('/proc/self/task')))\n"
    )
    inherited = {key: value for key, value in os.environ.items() if not key.endswith("_THREADS")}
    done = subprocess.run(
        [sys.executable, "-c", program],
        input=demo_text(),
        capture_output=True,
        text=True,
        check=False,
        cwd=TOP,
        env=inherited,
        timeout=60,
    )
    assert done.stdout == "1\n"
