"""Driving the board in tests: run it without a terminal, and wait for conditions instead of times."""

from __future__ import annotations

import asyncio
from collections.abc import Awaitable, Callable
from typing import cast

from textual.app import App
from textual.pilot import Pilot

from agewatch.board.app import BoardApp
from agewatch.board.screens.list_screen import ListScreen

_READING = {"read", "trace", "acknowledge"}
_PATIENCE_S = 10.0


async def settled(pilot: Pilot[None]) -> None:
    """Until nothing is being read any more and what was read is on the screen."""
    async with asyncio.timeout(_PATIENCE_S):
        while True:
            await pilot.pause()
            if all(worker.is_finished for worker in pilot.app.workers if worker.group in _READING):
                break
    await pilot.pause()


async def until(pilot: Pilot[None], condition: Callable[[], bool]) -> None:
    """Until `condition` holds; a timeout is a failure."""
    async with asyncio.timeout(_PATIENCE_S):
        while not condition():
            await pilot.pause(0.01)


def drive(
    app: BoardApp, task: Callable[[Pilot[None]], Awaitable[None]], size: tuple[int, int] = (120, 28)
) -> None:
    """Run `app` on a screen of `size`, do `task` once it shows its first data, and end it."""

    async def run() -> None:
        async with app.run_test(size=size, notifications=True) as pilot:
            await settled(pilot)
            await task(pilot)

    asyncio.run(run())


async def press(pilot: Pilot[None], *keys: str) -> None:
    await pilot.press(*keys)
    await settled(pilot)


async def type_words(pilot: Pilot[None], words: str) -> None:
    names = {" ": "space", "-": "minus"}
    await press(pilot, *(names.get(character, character) for character in words))


def listed(app: BoardApp) -> ListScreen:
    """The screen that is shown, as the list that it is."""
    return cast(ListScreen, app.screen)


def screen_text(app: App[None]) -> str:
    """What stands on the screen, line by line."""
    strips = app.screen._compositor.render_strips()
    return "\n".join("".join(segment.text for segment in strip) for strip in strips)


def said(app: BoardApp) -> str:
    """The last sentence that the board told in passing."""
    return [each.message for each in app._notifications][-1]
