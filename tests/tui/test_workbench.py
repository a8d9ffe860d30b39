"""The workbench by its keys, through Textual's own pilot."""

from __future__ import annotations

import asyncio
import os
from dataclasses import replace
from pathlib import Path

import pytest

from physics.levels import find_levels
from pilot import bench
from tui.session.demo import demo_text
from tui.session.read import load
from tui.workbench import document as documents
from tui.workbench.panes import Pane
from tui.workbench.prompt import Prompt
from tui.workbench.screens import Question, Reader

COMMENT = "# kept through every save\n"


@pytest.fixture
def path(tmp_path: Path) -> Path:
    file = tmp_path / "diode.toml"
    file.write_text(COMMENT + demo_text(), encoding="utf-8")
    return file


async def test_what_is_shown_is_what_was_computed() -> None:
    async with bench() as b:
        assert b.app.study is not None
        scene = b.app.study.scene
        exact = find_levels(scene.profile, scene.from_eV, scene.to_eV, scene.max_width_eV)
        reading = b.text("reading")
        assert f"{1e3 * exact.levels[0].energy_eV:.4f} meV" in reading
        assert "2 levels, proved complete" in reading
        assert "3 well 92 %" in reading
        assert "log10 T" in b.text("figure")


async def test_a_step_recomputes() -> None:
    async with bench() as b:
        before = b.app.study
        await b.press("down", "down", "right", "plus")
        assert b.app.session.layers[2].thickness_ml == 23.0
        assert b.app.study is not before
        assert b.app.study is not None
        assert b.app.study.scene.structure.layers[2].thickness_nm == pytest.approx(23 * 0.2826625)
        assert "*" in b.text("title")
        await b.press("u")
        assert b.app.session.layers[2].thickness_ml == 22.0
        await b.press("r")
        assert b.app.session.layers[2].thickness_ml == 23.0


async def test_typing_a_value_and_being_refused() -> None:
    async with bench() as b:
        await b.press("down", "3")
        assert b.app.is_asking
        await b.type("0")
        assert b.app.is_asking
        assert "1e-6" in b.text("prompt-label")
        assert b.app.query_one(Prompt).line.value == "0"
        await b.type("3.2 nm")
        assert not b.app.is_asking
        assert b.app.session.layers[1].thickness_nm == 3.2
        await b.press("enter")
        await b.press("escape")
        assert not b.app.is_asking
        assert b.app.session.layers[1].thickness_nm == 3.2


async def test_a_value_is_typed_in_its_field() -> None:
    async with bench() as b:
        await b.press("down", "enter")
        line = b.app.query_one(Prompt).line
        sheet = b.app.query_one("#sheet", Pane)
        row = line.region.y - sheet.region.y
        assert sheet._strips[row].text.startswith("  2 first barrier")
        assert line.region.right == b.app.field_region.right + 1
        assert "thickness" in b.text("prompt-label")
        await b.type("3 kg")
        assert line.value == "3 kg"
        assert "unit kg" in b.text("prompt-label")
        await b.pilot.resize_terminal(80, 24)
        await asyncio.sleep(0.15)
        await b.settle()
        assert line.value == "3 kg"
        assert line.region.y == b.app.field_region.y
        assert sheet._strips[line.region.y - sheet.region.y].text.startswith("  2 first barrier")


async def test_energy_line_snaps_from_level_to_level() -> None:
    async with bench() as b:
        assert b.app.study is not None
        levels = b.app.study.levels.levels
        assert b.app.reading is not None
        assert b.app.reading.number == 1
        await b.press("n")
        assert b.app.reading.energy_eV == levels[1].energy_eV
        assert b.app.reading.density is not None
        await b.press("n")
        assert b.app.reading.number == 2
        await b.press("j")
        assert b.app.reading.number is None
        assert levels[0].energy_eV < b.app.reading.energy_eV < levels[1].energy_eV
        between = b.app.reading.energy_eV
        await b.press("K")
        assert 0.0 < b.app.reading.energy_eV - between < 0.01
        await b.press("p")
        assert b.app.reading.number == 1
        await b.press("e")
        await b.type("120 meV")
        assert b.app.reading.energy_eV == 0.12
        assert "(nearest)" in b.text("reading")


async def test_layers_by_keys() -> None:
    async with bench() as b:
        await b.press("down", "d")
        assert len(b.app.session.layers) == 6
        assert b.app.cursor.row == 4
        await b.press("x")
        assert len(b.app.session.layers) == 5
        await b.press("left_square_bracket", "s", "a")
        assert len(b.app.session.layers) == 7
        for _ in range(4):
            await b.press("u")
        assert len(b.app.session.layers) == 6
        await b.press("up", "up", "up", "up", "up", "up", "x")
        assert "cursor on a layer" in b.text("prompt-label")


async def test_a_design_that_does_not_compute_is_said_and_mended() -> None:
    async with bench() as b:
        await b.press("left", "enter")
        await b.type("AlXs")
        assert b.app.study is not None
        assert b.app.structure is None
        assert "old answer shown" in b.text("title")
        assert "AlXs" in b.text("prompt-label")
        roles = {
            str(part.style) for strip in b.app.query_one("#figure", Pane)._strips for part in strip
        }
        assert roles <= {"dim", "none"}
        await b.press("enter")
        await b.type("AlAs")
        assert b.app.trouble == ""
        assert "old answer" not in b.text("title")


async def test_saving_keeps_comments_and_quitting_asks(path: Path) -> None:
    async with bench(documents.opened(path)) as b:
        await b.press("plus", "q")
        assert isinstance(b.app.screen, Question)
        await b.press("escape")
        assert b.app.return_value is None
        await b.press("w")
        text, session = load(path)
        assert text.startswith(COMMENT)
        assert session == b.app.session
        assert "*" not in b.text("title").split("  ")[0]
        await b.press("q")
        assert b.app.return_value == 0


async def test_quitting_may_save_first(path: Path) -> None:
    async with bench(documents.opened(path)) as b:
        await b.press("plus", "q", "s")
        assert b.app.return_value == 0
        assert load(path)[1] == b.app.session


async def test_quitting_the_demo_may_save_it_first(tmp_path: Path) -> None:
    target = tmp_path / "mine.toml"
    async with bench() as b:
        await b.press("plus", "q", "s")
        assert b.app.return_value is None
        await b.type(str(target))
        assert b.app.return_value == 0
        assert load(target)[1] == b.app.session


async def test_saving_first_asks_before_it_overwrites(path: Path) -> None:
    async with bench(documents.opened(path)) as b:
        await b.press("plus")
        path.write_text("# somebody else's\n" + demo_text(), encoding="utf-8")
        await b.press("q", "s")
        assert isinstance(b.app.screen, Question)
        assert "somebody else's" in path.read_text(encoding="utf-8")
        await b.press("o")
        assert b.app.return_value == 0
        assert path.read_text(encoding="utf-8").startswith(COMMENT)


@pytest.mark.parametrize("name", ["", "~nobody-of-this-name/x", "x" * 5000, "a/../b/c", "\0"])
async def test_names_that_cannot_be(name: str) -> None:
    async with bench() as b:
        for key in ("W", "o"):
            await b.press(key)
            await b.type(name)
            assert b.app.is_asking
            assert b.text("prompt-label").strip() not in ("save as:", "open:")
            await b.press("escape")


async def test_a_file_changed_underneath_is_not_overwritten(path: Path) -> None:
    async with bench(documents.opened(path)) as b:
        await b.press("plus")
        path.write_text("# somebody else's\n" + demo_text(), encoding="utf-8")
        await b.press("w")
        assert isinstance(b.app.screen, Question)
        await b.press("escape")
        assert "somebody else's" in path.read_text(encoding="utf-8")
        await b.press("w", "o")
        assert path.read_text(encoding="utf-8").startswith(COMMENT)


async def test_save_as_open_and_new(path: Path, tmp_path: Path) -> None:
    async with bench() as b:
        target = tmp_path / "new.toml"
        await b.press("W")
        await b.type(str(target))
        assert load(target)[1] == b.app.session
        await b.press("W")
        await b.type(str(path))
        assert isinstance(b.app.screen, Question)
        await b.press("escape")
        assert path.read_text(encoding="utf-8").startswith(COMMENT)
        await b.press("N")
        assert len(b.app.session.layers) == 1
        await b.press("o")
        await b.type("/nowhere.toml")
        assert b.app.is_asking
        assert "no such file" in b.text("prompt-label")
        await b.type(str(path))
        assert b.app.document.path == path
        assert len(b.app.session.layers) == 5


async def test_pipes_and_devices_are_no_place_for_a_design(
    path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(path.parent)
    os.mkfifo("pipe")
    async with bench(documents.opened(path)) as b:
        for name in ("pipe", os.devnull):
            await b.press("W")
            await b.type(name)
            assert b.app.is_asking
            assert "no regular file" in b.text("prompt-label")
            await b.press("escape")
        assert b.app.document.path == path
        path.unlink()  # and where the design's own file has become one
        os.mkfifo(path)
        await b.press("plus", "w", "o")
        assert b.app.document.is_changed


async def test_the_notes_of_the_design(path: Path) -> None:
    async with bench(documents.opened(path)) as b:
        before = b.app.session
        assert "\n" in before.notes
        await b.press("T", "enter")
        assert b.app.session is before
        await b.press("T")
        await b.type("one\\ntwo \\\\n")
        assert b.app.session.notes == "one\ntwo \\n"
        await b.press("w")
        assert load(path)[1].notes == "one\ntwo \\n"
        await b.press("T")
        assert b.app.query_one(Prompt).line.value == "one\\ntwo \\\\n"
        await b.type("")
        assert b.app.session.notes == ""
        await b.press("T")
        await b.type("\x1b")
        assert b.app.is_asking
        assert "control" in b.text("prompt-label")


async def test_a_folder_that_cannot_be_written(path: Path) -> None:
    async with bench(documents.opened(path)) as b:
        await b.press("plus")
        path.unlink()
        path.parent.rmdir()
        await b.press("w")
        assert "it cannot be writ" in b.text("prompt-label")  # a long path cuts it
        assert b.app.document.is_changed


async def test_help_and_notes() -> None:
    async with bench() as b:
        await b.press("question_mark")
        assert isinstance(b.app.screen, Reader)
        await b.press("down", "pagedown", "escape")
        await b.press("i")
        assert isinstance(b.app.screen, Reader)
        await b.press("escape")
        assert not isinstance(b.app.screen, Reader)


@pytest.mark.parametrize("size", [(60, 18), (80, 24), (110, 35), (200, 50), (300, 100)])
async def test_sizes(size: tuple[int, int]) -> None:
    async with bench(size=size, plain=True) as b:
        await asyncio.sleep(0.15)
        await b.settle()
        shown = b.text("figure")
        assert "log10 T" in shown
        assert shown.isascii()
        if size[0] >= 200:
            assert "mainly in" in b.text("levels")
            assert "coherence" in b.text("notes")


async def test_long_stacks_are_walked_by_pages() -> None:
    document = documents.demo()
    document.session = replace(document.session, layers=document.session.layers * 8)
    async with bench(document, (80, 24)) as b:
        await b.press("pagedown")
        assert b.app.cursor.row == 12
        await b.press("end")
        assert b.app.field.place == ("right", 0)
        assert "37 above" in b.text("sheet")  # 42 rows, 5 of them seen
        await b.press("pageup", "home")
        assert b.app.field.place == ("conditions", 0)


async def test_too_small_is_said() -> None:
    async with bench(size=(50, 15)) as b:
        await asyncio.sleep(0.15)
        assert "needs 60 x 18" in b.text("small")


async def test_typing_ahead_ends_at_the_last_key() -> None:
    async with bench() as b:
        await b.pilot.press("down", "down", "right", *["plus"] * 25)
        await b.settle()
        assert b.app.study is not None
        assert b.app.session.layers[2].thickness_ml == 47.0
        assert b.app.study.scene.request.session == b.app.session
