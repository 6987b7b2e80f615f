"""Pictures of the screens, looked at by a person once and compared ever since. `--snapshot-update` takes them anew."""

from __future__ import annotations

from collections.abc import Awaitable, Callable

import pytest
from textual.pilot import Pilot

from tests.board.driving import press, settled
from tests.board.plant import board, plant

SnapCompare = Callable[..., bool]
SIZES = [(80, 24), (120, 40), (200, 60)]
_named = pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")


def _after(*keys: str) -> Callable[[Pilot[None]], Awaitable[None]]:
    """What is done before the picture is taken."""

    async def do(pilot: Pilot[None]) -> None:
        await settled(pilot)
        for key in keys:
            await press(pilot, key)

    return do


@_named
def test_store_screen(snap_compare: SnapCompare, size: tuple[int, int]) -> None:
    """The list, and where there is room the second coil in full."""
    assert snap_compare(board(plant()), terminal_size=size, run_before=_after("down"))


@_named
def test_alarms_screen(snap_compare: SnapCompare, size: tuple[int, int]) -> None:
    """The alarms, and what the first one asks for."""
    assert snap_compare(board(plant()), terminal_size=size, run_before=_after("2"))


def test_side_panel_below_a_narrow_list(snap_compare: SnapCompare) -> None:
    """On 80 columns words and curve stand side by side under the list."""
    assert snap_compare(board(plant()), terminal_size=(80, 24), run_before=_after("down", "enter"))


def test_store_screen_by_day(snap_compare: SnapCompare) -> None:
    """Dark on light."""
    assert snap_compare(board(plant()), terminal_size=(120, 40), run_before=_after("down", "ctrl+n"))


def test_help(snap_compare: SnapCompare) -> None:
    """Keys, marks and words."""
    assert snap_compare(board(plant()), terminal_size=(120, 40), run_before=_after("f1"))
