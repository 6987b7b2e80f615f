"""`python -m tests.pictures`: make README's pictures from the real program over the invented plant."""

from __future__ import annotations

import asyncio
import re
import shutil
import tempfile
from pathlib import Path

from agewatch.board.app import BoardApp
from agewatch.board.gateway import GatewayToStore, site_of
from agewatch.clock import ReplayClock, StoppedClock
from agewatch.daemon.cycle import take_turn
from agewatch.daemon.feeds import past_until_s, read_feeds
from agewatch.plant.settings_file import LoadedSettings, load_settings
from agewatch.store import open_store

DEMO = Path(__file__).parents[1] / "demo_inventory"
PICTURES = DEMO / "pictures"
HOURS_IN = 28.0
"""Into the demo's story."""


def main() -> None:
    with tempfile.TemporaryDirectory() as scratch:
        folder = Path(scratch) / "plant"
        shutil.copytree(DEMO, folder)
        loaded = load_settings(folder / "plant.toml")
        at_s = _take_turns(loaded)
        PICTURES.mkdir(exist_ok=True)
        for name, keys in {"store": (), "alarms": ("2",)}.items():
            picture = asyncio.run(_picture(loaded, at_s, keys))
            (PICTURES / f"{name}.svg").write_text(picture, encoding="utf-8")


def _take_turns(loaded: LoadedSettings) -> float:
    """Read the feeds and take two turns, a day apart; when the second was."""
    settings = loaded.settings
    assert settings.clock.start is not None
    start_s = settings.clock.start.timestamp()
    clock = ReplayClock(start_s, rate=1.0)
    end_s = start_s + HOURS_IN * 3600.0
    with open_store(settings.store.url, loaded.folder) as store:
        read_feeds(store, settings.feed, loaded.folder, clock, past_until_s(clock))
        for at_s in (start_s, end_s):
            take_turn(store, settings, loaded.digest, StoppedClock(at_s).now_s)
    return end_s


async def _picture(loaded: LoadedSettings, at_s: float, keys: tuple[str, ...]) -> str:
    app = BoardApp(GatewayToStore(loaded), StoppedClock(at_s + 20.0), site_of(loaded.settings))
    async with app.run_test(size=(144, 40)) as pilot:
        await pilot.pause()
        await app.workers.wait_for_complete()
        await pilot.press(*keys)
        await app.workers.wait_for_complete()
        await pilot.pause()
        drawn = app.export_screenshot(title="agewatch board")
    return re.sub(r"@font-face \{.*?\}\s*", "", drawn, flags=re.DOTALL)  # no font from outside


if __name__ == "__main__":
    main()
