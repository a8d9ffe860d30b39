"""The workbench driven by its keys, through Textual's own pilot."""

from __future__ import annotations

import asyncio
from collections.abc import AsyncIterator, Callable
from contextlib import asynccontextmanager
from typing import Any

from tui.figures.cells import PLAIN, RICH
from tui.workbench import document as documents
from tui.workbench.app import Workbench
from tui.workbench.document import Document
from tui.workbench.panes import Pane
from tui.workbench.prompt import Prompt


class Driver:
    """A pilot that waits for answers instead of for time."""

    def __init__(self, app: Workbench, pilot: Any) -> None:
        self.app, self.pilot = app, pilot

    async def until(self, condition: Callable[[], bool]) -> None:
        for _ in range(400):
            if condition():
                return
            await asyncio.sleep(0.01)
        raise AssertionError(self.text())

    async def press(self, *keys: str) -> None:
        await self.pilot.press(*keys)
        await self.settle()

    async def settle(self) -> None:
        await self.pilot.pause()
        await self.until(lambda: not self.app.is_computing)
        await self.pilot.pause()

    async def type(self, text: str) -> None:
        self.app.query_one(Prompt).line.value = text
        await self.press("enter")

    def text(self, pane: str = "") -> str:
        panes = [self.app.query_one(f"#{pane}", Pane)] if pane else list(self.app.query(Pane))
        return "\n".join(strip.text for p in panes for strip in p._strips)


@asynccontextmanager
async def bench(
    document: Document | None = None, size: tuple[int, int] = (110, 35), *, plain: bool = False
) -> AsyncIterator[Driver]:
    app = Workbench(document or documents.demo(), PLAIN if plain else RICH)
    async with app.run_test(size=size) as pilot:
        driver = Driver(app, pilot)
        await driver.until(lambda: app.study is not None)
        await driver.settle()
        yield driver
