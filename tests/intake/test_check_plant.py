"""The committed plant with known answers is read whole."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path

from agewatch.intake import read_feed
from agewatch.plant.settings_file import load_settings

FOLDER = Path(__file__).parents[1] / "check_plant"
AT_S = datetime(2025, 7, 18, 5, 30, tzinfo=UTC).timestamp()


def test_every_row_of_the_check_plant_goes_in() -> None:
    """As many rows as the files have lines below their headers, and no reject."""
    loaded = load_settings(FOLDER / "plant.toml")
    for feed in loaded.settings.feed:
        (source,) = read_feed(feed, loaded.folder, now_s=AT_S, known={})
        assert source.error is None
        assert source.rejects == []
        assert len(source.rows) == (FOLDER / feed.path).read_text().count("\n") - 1
