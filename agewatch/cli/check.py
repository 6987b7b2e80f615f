"""`agewatch check`: what is wrong with settings and feeds, before the daemon finds out."""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import asdict
from datetime import datetime
from pathlib import Path
from zoneinfo import ZoneInfo

import click

from agewatch.assemble import open_plant
from agewatch.cli.checking import FeedFound, PlantFound, check_secrets, look_at
from agewatch.cli.options import config_option, form_options
from agewatch.cli.tables import text_table
from agewatch.clock import rfc3339
from agewatch.errors import FeedError, SettingsError
from agewatch.messages.inert import inert
from agewatch.plant.settings_file import LoadedSettings

SHOWN_REJECTS = 5
"""Of each feed; `--json` has them all."""
_SHOWN_NAMES = 10


@click.command("check")
@config_option
@form_options(csv=False)
def command(config: Path, as_json: bool) -> None:
    """Read settings and feeds and tell all that is wrong with them. Nothing is kept.

    Exit status: 0 all is well, 1 rows are rejected or names do not fit together, 2 the settings are refused,
    3 a feed cannot be read.
    """
    loaded = open_plant(config)
    problems = check_secrets(loaded)
    if problems:
        raise SettingsError(problems)
    found = look_at(loaded)
    if as_json:
        click.echo(json.dumps(_document(loaded, found)))
    else:
        for line in _lines(loaded, found):
            click.echo(line)
    if not found.readable:
        click.get_current_context().exit(FeedError.exit_status)
    if not found.is_whole:
        click.get_current_context().exit(1)


def _document(loaded: LoadedSettings, found: PlantFound) -> dict[str, object]:
    feeds = []
    for feed in found.feeds:
        fields = asdict(feed)
        newest_s = fields.pop("newest_s")
        feeds.append({**fields, "newest": None if newest_s is None else rfc3339(newest_s)})
    return {
        "files": [str(file) for file in loaded.files],
        "settings_digest": loaded.digest,
        "feeds": feeds,
        "sensors": found.sensors,
        "unknown": found.unknown,
    }


def _lines(loaded: LoadedSettings, found: PlantFound) -> Iterator[str]:
    settings = loaded.settings
    files = ", ".join(str(file) for file in loaded.files)
    yield (
        f"settings hold: {len(settings.location)} locations, {len(settings.grade)} grades, "
        f"{len(settings.part)} parts, {len(settings.feed)} feeds, {len(settings.endpoint)} endpoints ({files})"
    )
    yield ""
    zone = ZoneInfo(settings.site.timezone)
    heading = ("feed", "files", "rows", "rejected", f"newest ({settings.site.timezone})")
    yield from text_table(heading, (_feed_row(feed, zone) for feed in found.feeds), right=(1, 2, 3))
    for feed in found.feeds:
        yield from _feed_faults(feed)
    yield ""
    yield from text_table(("location", "sensors seen", "never seen"), _sensor_rows(found))
    for kind, names in found.unknown.items():
        if names:
            told = ", ".join(
                f"{inert(name, 40)} ({count} rows)" for name, count in [*names.items()][:_SHOWN_NAMES]
            )
            more = f" and {len(names) - _SHOWN_NAMES} more" if len(names) > _SHOWN_NAMES else ""
            yield f"not in the settings: {kind} {told}{more}"


def _feed_row(feed: FeedFound, zone: ZoneInfo) -> tuple[str, ...]:
    newest = "–" if feed.newest_s is None else f"{datetime.fromtimestamp(feed.newest_s, zone):%Y-%m-%d %H:%M}"
    return feed.feed, str(feed.files), str(feed.rows), str(len(feed.rejects)), newest


def _feed_faults(feed: FeedFound) -> Iterator[str]:
    for trouble in feed.troubles:
        yield f"{feed.feed}: cannot be read: {inert(trouble, 300)}"
    for reject in feed.rejects[:SHOWN_REJECTS]:
        where = f"{reject.source} line {reject.line}" + (f", {reject.column}" if reject.column else "")
        yield inert(f"{where}: {reject.reason}", 300)
    if len(feed.rejects) > SHOWN_REJECTS:
        yield f"{feed.feed}: {len(feed.rejects) - SHOWN_REJECTS} more rows are rejected"


def _sensor_rows(found: PlantFound) -> Iterator[tuple[str, str, str]]:
    for place, sensors in found.sensors.items():
        seen = [sensor for sensor, is_seen in sensors.items() if is_seen]
        silent = [sensor for sensor, is_seen in sensors.items() if not is_seen]
        yield place, ", ".join(seen) or "none", ", ".join(silent) or "–"
