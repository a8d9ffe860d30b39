"""``winze tolerance`` and its tables in the session text."""

import json
import os
import signal
import subprocess
import sys
import time
from dataclasses import replace
from pathlib import Path

import pytest

from tui.command.entry import main
from tui.session.demo import demo_text
from tui.session.read import read_session
from tui.session.refusal import SessionError
from tui.session.write import write_session

TOP = Path(__file__).parents[2]
TABLES = """
# as the grower says
[tolerance]
rate_percent = 1   # drift
thickness_ml = 0.5
draws = 64

# what the receiver wants
[[spec]]
result = "level 1 energy_eV"
at_least = 0.06  # eV
at_most = 0.066

[[spec]]
result = "level 1 width_eV"
at_most = 0.0015
"""


@pytest.fixture
def design(tmp_path: Path) -> str:
    path = tmp_path / "design.toml"
    path.write_text(demo_text() + TABLES, encoding="utf-8")
    return str(path)


def test_table(capsys: pytest.CaptureFixture[str], design: str, tmp_path: Path) -> None:
    each = tmp_path / "draws.csv"
    assert main(["tolerance", design, "--jobs", "1", "--each", str(each)]) == 0
    said = capsys.readouterr()
    lines = said.out.splitlines()
    head = "result,nominal,mean,sd,p05,p50,p95,at_least,at_most,yield,yield_low,yield_high"
    assert lines[0] == head
    assert [line.split(",")[0] for line in lines[1:]] == ["level 1 energy_eV", "level 1 width_eV"]
    assert "winze: joint yield " in said.err
    assert "winze: cost 1: thickness" in said.err
    assert "winze: linear estimate: joint yield" in said.err
    rows = each.read_text(encoding="utf-8").splitlines()
    assert rows[0].startswith("rate GaAs,rate Al0.4Ga0.6As,thickness layer 1,")
    assert len(rows) == 65


def test_json(capsys: pytest.CaptureFixture[str], design: str) -> None:
    assert main(["tolerance", design, "--jobs", "1", "--json", "--seed", "3"]) == 0
    said = capsys.readouterr()
    assert not said.err
    found = json.loads(said.out)
    wanted = {"results", "yield", "interval", "sources", "linear", "draws", "seed"}
    assert wanted <= set(found)
    assert (found["draws"], found["seed"]) == (64, 3)
    assert found["interval"]["low"] <= found["yield"] <= found["interval"]["high"]
    assert {source["source"] for source in found["sources"]} == {"rate", "thickness"}
    assert found["results"][1]["at_least"] is None


def test_without_specifications(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    path = tmp_path / "free.toml"
    path.write_text(demo_text() + "\n[tolerance]\ncomposition = 0.005\n", encoding="utf-8")
    assert main(["tolerance", str(path), "--draws", "16", "--jobs", "1", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["yield"] is None
    assert found["interval"] is None
    assert len(found["results"]) == 4
    assert found["results"][0]["sd"] > 0.0


def test_read_and_written_back() -> None:
    text = demo_text() + TABLES
    session = read_session(text, "text")
    assert session.tolerance.draws == 64
    assert read_session(write_session(session), "fresh") == session
    first = replace(session.specs[0], at_most=0.07)
    changed = replace(session, specs=(first,), tolerance=replace(session.tolerance, seed=4))
    written = write_session(changed, text)
    assert read_session(written, "changed") == changed
    assert "at_least = 0.06  # eV" in written
    assert "rate_percent = 1   # drift" in written
    bare = write_session(read_session(demo_text(), "demo"), text)
    assert read_session(bare, "bare").specs == ()


@pytest.mark.parametrize(
    ("table", "line", "words"),
    [
        ("[tolerance]\ndraws = 2.5", 2, "draws are a whole number from 8"),
        ("[tolerance]\nrate = 1", 2, "has no unit; write rate_percent"),
        ("[tolerance]\nrate_percent = -1", 2, "between 0 and 20 %"),
        ("[tolerance]\nthickness_nm = 1\nthickness_ml = 1", 3, "keep one of the two"),
        ("[[spec]]\nat_most = 1", 1, "name the result"),
        ('[[spec]]\nresult = "peak bias_V"', 1, "give at_least, at_most or both"),
        ('[[spec]]\nresult = "a"\nat_least = 2\nat_most = 1', 4, "not above at_least = 2"),
        ('[[spec]]\nresult = "a"\nat_most = "b"', 3, "a number is expected"),
    ],
)
def test_refused_tables(table: str, line: int, words: str) -> None:
    text = f"{demo_text()}{table}\n"
    with pytest.raises(SessionError, match=words) as refusal:
        read_session(text, "bad.toml")
    assert refusal.value.line == demo_text().count("\n") + line


def test_a_result_that_is_none(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    path = tmp_path / "odd.toml"
    tables = '[tolerance]\nrate_percent = 1\n[[spec]]\nresult = "level 1 hue"\nat_most = 1\n'
    path.write_text(demo_text() + tables, encoding="utf-8")
    assert main(["tolerance", str(path)]) == 2
    said = capsys.readouterr().err
    assert f"{path}, line {demo_text().count(chr(10)) + 4}: result is 'level 1 hue'" in said


def test_draws_do_not_take_the_text_s_place(
    capsys: pytest.CaptureFixture[str], design: str
) -> None:
    assert main(["tolerance", design, "--each", design]) == 2
    assert "--each names the session text itself" in capsys.readouterr().err


@pytest.mark.skipif(os.name != "posix", reason="interrupts are sent otherwise")
def test_an_interrupt_ends_all_processes(design: str) -> None:
    """As Ctrl-C does, to the whole group; what there is comes out, and nobody is left."""
    call = [sys.executable, "-m", "tui.command.entry", "tolerance", design]
    process = subprocess.Popen(
        [*call, "--draws", "100000", "--jobs", "2"],
        cwd=TOP,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )
    assert process.stderr is not None
    while "joint yield" not in process.stderr.readline():
        assert process.poll() is None
    time.sleep(5.0)  # for processes to start and to do some draws
    os.killpg(process.pid, signal.SIGINT)
    out, said = process.communicate(timeout=60)
    assert process.returncode == 130, said
    assert "Traceback" not in said
    assert "interrupted: this is the answer of " in said
    assert out.startswith("result,")
    for _ in range(100):
        try:
            os.killpg(process.pid, 0)
        except ProcessLookupError:
            return
        time.sleep(0.1)
    pytest.fail("a process is left")
