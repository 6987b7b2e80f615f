"""`agewatch rejects`: the rows that could not be used, out to be mended and in again."""

from __future__ import annotations

import csv
import json
from collections.abc import Iterator, Sequence
from pathlib import Path

import click

from agewatch.assemble import open_desk, open_plant
from agewatch.cli.options import chosen_form, config_option, form_options
from agewatch.cli.tables import armed, csv_line, disarmed, text_table
from agewatch.clock import rfc3339
from agewatch.errors import UsageError
from agewatch.plant.records import StoredReject
from agewatch.plant.settings_file import LoadedSettings
from agewatch.store import open_reader, queries

FIELDS = ("reject_id", "feed", "source", "line", "column", "reason", "received_at", "header", "raw")
"""Columns of an exported file. `raw` is the row as it came: it is what is to be mended."""
AT_ONCE_BYTES = 30_000
"""Mended rows that are sent to the daemon in one request."""

feed_option = click.option("--feed", help="Of this feed only, by the name that messages give it.")


@click.group("rejects")
def command() -> None:
    """List, export and submit again the rows that could not be used."""


@command.command("list")
@config_option
@form_options(csv=True)
@feed_option
def list_rejects(config: Path, as_json: bool, as_csv: bool, feed: str | None) -> None:
    """Show the rows that wait to be mended, oldest first."""
    form = chosen_form(as_json, as_csv)
    rejects = _open_rejects(open_plant(config), feed)
    if form == "json":
        lines = iter([json.dumps([_fields(stored) for stored in rejects])])
    elif form == "csv":
        lines = (csv_line(cells) for cells in (FIELDS, *(_fields(stored).values() for stored in rejects)))
    else:
        lines = _text_lines(rejects)
    for line in lines:
        click.echo(line)


@command.command("export")
@config_option
@feed_option
@click.argument("file", type=click.Path(path_type=Path))
def export(config: Path, feed: str | None, file: Path) -> None:
    """Write the waiting rows to FILE, a CSV table. Mend the cells under `raw`, then submit the file again."""
    rejects = _open_rejects(open_plant(config), feed)
    try:
        with file.open("x", encoding="utf-8", newline="") as table:
            writer = csv.writer(table)
            writer.writerow(FIELDS)
            for stored in rejects:
                cells = _fields(stored).values()
                writer.writerow([disarmed(cell) if isinstance(cell, str) else cell for cell in cells])
    except OSError as fault:
        raise UsageError(f"{file}: {fault.strerror}; name a new file") from None
    click.echo(f"{len(rejects)} rows written to {file}")


@command.command("resubmit")
@config_option
@click.argument("file", type=click.Path(path_type=Path))
def resubmit(config: Path, file: Path) -> None:
    """Take in the mended rows of FILE, which `export` wrote. Rows that are still at fault wait on.

    Exit status 1: not every row of the file could be taken in.
    """
    mended = _mended(file)
    with open_desk(open_plant(config)) as ask:
        said = [ask({"action": "resubmit", "mended": some}) for some in _requests(mended)]
    for reply in said:
        click.echo(reply.said)
    if not all(reply.ok for reply in said):
        click.get_current_context().exit(1)


def _open_rejects(loaded: LoadedSettings, feed: str | None) -> list[StoredReject]:
    names = [each.name for each in loaded.settings.feed]
    if feed is not None and feed not in names:
        raise UsageError(f"no feed is named {feed}; there is {', '.join(names) or 'none'}")
    with open_reader(loaded.settings.store.url, loaded.folder) as reader, reader.read() as view:
        return queries.open_rejects(view, feed)


def _fields(stored: StoredReject) -> dict[str, object]:
    reject = stored.reject
    values = (
        stored.reject_id, stored.feed, reject.source, reject.line, reject.column, reject.reason,
        rfc3339(stored.received_s), reject.header, reject.raw,
    )  # fmt: skip
    return dict(zip(FIELDS, values, strict=True))


def _text_lines(rejects: Sequence[StoredReject]) -> Iterator[str]:
    if rejects:
        rows = [
            (str(stored.reject_id), reject.source, str(reject.line), reject.column, reject.reason)
            for stored in rejects
            for reject in (stored.reject,)
        ]
        yield from text_table(("no.", "source", "line", "column", "reason"), rows, right=(0, 2))
    yield f"rows that wait to be mended: {len(rejects)}"


def _mended(file: Path) -> dict[str, str]:
    """Raw text by the number of the reject."""
    try:
        with file.open(encoding="utf-8-sig", newline="") as table:
            return {row["reject_id"]: armed(row["raw"]) for row in csv.DictReader(table)}
    except OSError as fault:
        raise UsageError(
            f"{file}: {fault.strerror}; name the file that `agewatch rejects export` wrote"
        ) from None
    except (KeyError, AttributeError, UnicodeDecodeError, csv.Error):
        raise UsageError(
            f"{file}: allowed is CSV in UTF-8 with the columns reject_id and raw, as `agewatch rejects export` has it"
        ) from None


def _requests(mended: dict[str, str]) -> Iterator[dict[str, str]]:
    """The mended rows in lots that a request can hold."""
    lot: dict[str, str] = {}
    size = 0
    for number, text in mended.items():
        length = len(json.dumps({number: text}))
        if lot and size + length > AT_ONCE_BYTES:
            yield lot
            lot, size = {}, 0
        lot[number] = text
        size += length
    if lot:
        yield lot
