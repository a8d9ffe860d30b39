"""The current view by its keys, through Textual's own pilot."""

from __future__ import annotations

import asyncio
from dataclasses import replace

import numpy as np
import pytest

from physics.curve import curve_at
from pilot import Driver, bench
from tui.session.demo import demo_text
from tui.session.read import read_session
from tui.session.resolve import resolve
from tui.sweep import Sweep, drive_of
from tui.workbench import current_actions, currents
from tui.workbench import document as documents
from tui.workbench.document import Document
from tui.workbench.keys import help_lines
from tui.workbench.panes import CurrentPane, Pane
from tui.workbench.screens import Reader

DEMO = read_session(demo_text(), "demo")


def document(**changes: object) -> Document:
    made = documents.demo()
    made.session = made.saved = replace(made.session, **changes)  # type: ignore[arg-type]
    return made


def short_range() -> Document:
    return document(sweep=replace(DEMO.sweep, from_V=0.0, to_V=0.2))


def found(b: Driver) -> Sweep:
    assert b.app.news is not None
    assert b.app.news.sweep is not None
    return b.app.news.sweep


def line_column(b: Driver) -> int:
    figure = b.app.query_one("#current", CurrentPane)
    assert figure.base is not None
    return figure.base.column_of(b.app.bias_V)


async def test_the_current_takes_the_place_of_the_bands_and_gives_it_back() -> None:
    async with bench(short_range()) as b:
        assert b.app.news is None  # nothing is computed unasked
        await b.press("c")
        assert b.app.query_one("#current", Pane).display
        assert not b.app.query_one("#figure", Pane).display
        assert "bias V" in b.text("current")
        assert "kA/cm2" in b.text("current")
        assert "share 1" in b.text("current")
        assert found(b).refined
        await b.press("c")
        assert b.app.query_one("#figure", Pane).display
        assert "log10 T" in b.text("figure")


async def test_what_is_read_off_is_what_is_computed_there() -> None:
    async with bench(short_range()) as b:
        await b.press("c", "e")
        await b.type("0.1")
        drive, _ = drive_of(DEMO, resolve(DEMO), (0.0, 0.2))
        exact = curve_at(drive, np.array([0.1])).current_density_A_per_cm2[0]
        assert f"J {1e-3 * exact:.2f} kA/cm2 +- " in b.text("reading")
        assert "level 1 9" in b.text("reading")
        region = found(b).main
        assert region is not None
        assert region.valley is not None
        assert f"P1 {1e-3 * region.peak.current_density_A_per_cm2:.2f} kA/cm2" in b.text("reading")
        assert f"ratio {region.peak_to_valley:.4g}" in b.text("reading")
        assert "mA/um2" in b.text("reading")
        await b.press("i")
        assert isinstance(b.app.screen, Reader)


async def test_the_line_moves_the_bias_and_the_bands_follow() -> None:
    async with bench(short_range()) as b:
        await b.press("c")
        at = line_column(b)
        await b.press("k", "k", "k")
        step = b.app.bias_V / 3.0
        assert step == pytest.approx(0.005)
        assert line_column(b) > at
        await b.press("K")
        assert b.app.bias_V == pytest.approx(3.1 * step)
        await b.press("j")
        assert b.app.bias_V == pytest.approx(3.0 * step)
        await b.press("c")
        assert b.app.study is not None
        right = b.app.study.profile.contact_edge_eV[1]
        assert right == pytest.approx(-b.app.bias_V)


async def test_moves_that_follow_each_other_are_undone_together(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    async with bench(short_range()) as b:
        await b.press("c")
        monkeypatch.setattr(current_actions, "BURST_PAUSE_S", 1e3)
        await b.press("k", "k", "K", "n")
        assert len(b.app.document.past) == 1
        monkeypatch.setattr(current_actions, "BURST_PAUSE_S", 0.0)
        before = b.app.bias_V
        await b.press("k")
        assert len(b.app.document.past) == 2
        await b.press("u")
        assert b.app.bias_V == before
        await b.press("u")
        assert b.app.session == b.app.document.saved
        await b.press("r")
        assert b.app.bias_V == before
        monkeypatch.setattr(current_actions, "BURST_PAUSE_S", 1e3)
        await b.press("k")
        assert len(b.app.document.past) == 2  # what was undone to is no part of a burst


async def test_an_edit_between_ends_a_burst(monkeypatch: pytest.MonkeyPatch) -> None:
    async with bench(short_range()) as b:
        monkeypatch.setattr(current_actions, "BURST_PAUSE_S", 1e3)
        await b.press("c", "k", "plus", "k", "k")
        assert len(b.app.document.past) == 3


async def test_from_feature_to_feature() -> None:
    async with bench(short_range()) as b:
        await b.press("c")
        region = found(b).main
        assert region is not None
        assert region.valley is not None
        assert region.onset_V is not None
        await b.press("n")
        assert b.app.bias_V == pytest.approx(region.onset_V, abs=1e-7)
        await b.press("n")
        assert b.app.bias_V == pytest.approx(region.peak.bias_V, abs=1e-7)
        assert "peak P1" in b.text("prompt-label")
        await b.press("n")
        assert b.app.bias_V == pytest.approx(region.valley.bias_V, abs=1e-7)
        await b.press("n")
        assert "no further" in b.text("prompt-label")
        await b.press("p")
        assert b.app.bias_V == pytest.approx(region.peak.bias_V, abs=1e-7)


async def test_moving_the_line_computes_no_curve_anew() -> None:
    async with bench(short_range()) as b:
        await b.press("c")
        first = found(b)
        await b.press("k", "k", "t")
        await b.type("another title")
        assert found(b) is first
        await b.press("plus")
        second = found(b)
        assert second is not first
        await b.press("u")
        assert found(b) is first  # kept, not computed again


async def test_decades() -> None:
    async with bench(short_range(), plain=True) as b:
        await b.press("c")
        assert "1e3" not in b.text("current")
        await b.press("l")
        assert "1e3" in b.text("current")
        assert "A/cm2" in b.text("current")
        await b.press("l", "c", "l")
        assert "c shows it" in b.text("prompt-label")


async def test_temperatures_are_laid_over() -> None:
    async with bench(short_range(), plain=True) as b:
        await b.press("c", "O")
        await b.type("77 cold")
        assert b.app.is_asking
        await b.type("1 2 3 4 5")
        assert b.app.is_asking
        await b.type(" 77   4.2 ")
        assert b.app.session.sweep.overlay_K == "77 4.2"
        assert b.app.news is not None
        assert [item.temperature_K for item in b.app.news.overlays] == [77.0, 4.2]
        for name in ("*300 K", "+77 K", "x4.2 K"):
            assert name in b.text("current")
        await b.press("u")
        assert "77 K" not in b.text("current")


async def test_breaking_off_and_taking_up_again(monkeypatch: pytest.MonkeyPatch) -> None:
    async with bench() as b:
        slow = currents.sweep
        begun = asyncio.Event()
        loop = asyncio.get_running_loop()

        def waits(request: object, watch: object, tell: object) -> Sweep:
            loop.call_soon_threadsafe(begun.set)
            while True:
                watch()  # type: ignore[operator]

        monkeypatch.setattr(currents, "sweep", waits)
        await b.pilot.press("c")
        await asyncio.wait_for(begun.wait(), 10.0)
        assert "computing the current" in b.text("title")
        assert "Esc breaks off" in b.text("current")
        await b.press("escape")
        assert "broken off" in b.text("title")
        await b.press("k")
        assert b.app.wanted is None  # not taken up unasked
        monkeypatch.setattr(currents, "sweep", slow)
        await b.press("C")
        assert found(b).refined


async def test_an_edit_breaks_off_what_is_stale(monkeypatch: pytest.MonkeyPatch) -> None:
    async with bench(short_range()) as b:
        asked = []
        real = currents.sweep

        def noted(request: currents.SweepRequest, watch: object, tell: object) -> Sweep:
            asked.append(request.session)
            while len(asked) == 1:
                watch()  # type: ignore[operator]
            return real(request, watch, tell)  # type: ignore[arg-type]

        monkeypatch.setattr(currents, "sweep", noted)
        await b.pilot.press("c")
        await b.until(lambda: len(asked) == 1)
        await b.press("plus")
        assert len(asked) == 2
        assert found(b).request.session.layers == b.app.session.layers


async def test_without_electrons_it_is_said_what_to_state() -> None:
    bare = {"donors_cm3": None, "fermi_eV": None}
    made = document(left=replace(DEMO.left, **bare), right=replace(DEMO.right, **bare))
    async with bench(made) as b:
        await b.press("c")
        assert "state donors_cm3 or fermi_eV of both contacts" in b.text("current")
        assert "no current" in b.text("title")
        await b.press("k", "n", "i", "escape", "l", "C")
        assert b.app.bias_V == pytest.approx(0.01)


async def test_an_empty_range_and_a_design_that_does_not_compute() -> None:
    made = document(sweep=replace(DEMO.sweep, from_V=0.3, to_V=0.1))
    async with bench(made) as b:
        await b.press("c")
        assert "range from 0.3 to 0.1 V is empty" in b.text("current")
    async with bench(short_range()) as b:
        await b.press("c", "left", "enter")
        await b.type("AlXs")
        assert "old curve shown" in b.text("title")
        await b.press("u")
        assert "old curve" not in b.text("title")


async def test_the_bias_line_outside_the_range() -> None:
    async with bench(document(sweep=replace(DEMO.sweep, from_V=0.05, to_V=0.2))) as b:
        await b.press("c")
        assert "outside the curve" in b.text("reading")
        await b.press("k")
        assert b.app.bias_V == 0.05
        assert "J " in b.text("reading")


@pytest.mark.parametrize("size", [(60, 18), (80, 24), (110, 35), (200, 50), (300, 100)])
@pytest.mark.parametrize("plain", [True, False])
async def test_sizes(size: tuple[int, int], plain: bool) -> None:
    async with bench(short_range(), size, plain=plain) as b:
        await asyncio.sleep(0.15)
        await b.press("c")
        shown = b.text("current")
        assert "P1" in shown
        assert "V1" in shown
        assert not plain or (shown + b.text("reading") + b.text("sheet")).isascii()
        assert "1" in b.text("reading")
        lines = b.app.query_one("#reading", Pane)
        assert all(strip.cell_length <= lines.size.width for strip in lines._strips)
        if size[0] >= 200:
            await b.press("k")
            await asyncio.sleep(0.15)
            await b.settle()
            assert b.app.study is not None
            conditions = b.app.study.scene.request.session.conditions
            assert conditions.bias_V == b.app.bias_V  # the levels beside it follow


async def test_the_forms_fields_are_those_of_the_view() -> None:
    async with bench(short_range()) as b:
        assert "widest eV" in b.text("sheet")
        await b.press("c", "home", *["right"] * 4, "4")
        await b.type("4 um2")
        assert b.app.session.device.mesa_um2 == 4.0
        await b.press("right", "2")
        await b.type("2")
        assert b.app.session.device.series_ohm == 2.0
        assert "cut-off" in b.text("reading")
        assert "GHz" in b.text("reading")
        assert "widest eV" not in b.text("sheet")


def test_the_help_lists_what_keys_do_to_the_current() -> None:
    text = "\n".join(help_lines())
    for said in ("bands, or the current", "the bias line one step up", "temperatures", "decades"):
        assert said in text
