"""`agewatch demo`: daemon, receiver and board together on an invented plant, in a scratch folder."""

from __future__ import annotations

import re
import subprocess
import tempfile
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from time import monotonic
from typing import Any

import click

from agewatch.alarms import Alarm
from agewatch.assemble import build_board, build_sink, open_plant
from agewatch.cli.assessment_output import summary
from agewatch.cli.demo_plant import Process, copy_plant, daemon, end, write_settings
from agewatch.cli.demo_signals import EndedBySignals
from agewatch.cli.options import debug_option
from agewatch.cli.tables import text_table
from agewatch.errors import AgeWatchError, StoreError
from agewatch.messages import MessageType
from agewatch.messages.inert import inert
from agewatch.messages.received import ReceivedMessage, line
from agewatch.plant.settings_file import LoadedSettings
from agewatch.store import open_reader, queries

STARTED_WITHIN_S = 60.0
LOOK_EVERY_S = 0.1
LOG = "daemon.log"

_FOR = re.compile(r"(\d+(?:\.\d+)?)\s*(s|min)?")


class RealTime(click.ParamType[float]):
    """`25s` or `2min`; becomes seconds."""

    name = "TIME"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        match = _FOR.fullmatch(str(value).strip())
        if match is None:
            self.fail(f"{value!r} is no time; write for example 25s or 2min", param, ctx)
        return float(match[1]) * (60.0 if match[2] == "min" else 1.0)


@click.command("demo")
@debug_option
@click.option("--headless", is_flag=True, help="Show no board; tell at the end what happened.")
@click.option(
    "--for", "for_s", type=RealTime(), default="25s", show_default=True, help="How long, when headless."
)
@click.option("--keep", is_flag=True, help="Keep the scratch folder and say where it is.")
def command(headless: bool, for_s: float, keep: bool) -> None:
    """Show the whole job on an invented plant: files are read, coils aged, alarms raised, messages received.

    Everything happens in a scratch folder, with a daemon, a receiver and a signing secret of its own. Weeks of
    plant time pass in minutes.
    """
    until_s = monotonic() + for_s
    with EndedBySignals() as signals, _scratch(keep) as folder:
        secret = copy_plant(folder)
        with build_sink([secret], 0, lambda _: None) as sink:
            loaded = open_plant(write_settings(folder, sink.url))
            with daemon(loaded.files[0], folder / LOG, signals) as process:
                _wait_for_assessment(loaded, process)
                if headless:
                    _let_it_run(process, until_s, folder)
                else:
                    build_board(loaded).run()
                status = end(process)
        if status:
            raise _died(status, folder)
        if headless:
            _tell(loaded, sink.received)


@contextmanager
def _scratch(keep: bool) -> Iterator[Path]:
    if keep:
        folder = Path(tempfile.mkdtemp(prefix="agewatch-demo-"))
        try:
            yield folder
        finally:
            click.echo(f"kept: {folder}", err=True)
    else:
        with tempfile.TemporaryDirectory(prefix="agewatch-demo-") as scratch:
            yield Path(scratch)


def _wait_for_assessment(loaded: LoadedSettings, process: Process) -> None:
    until_s = monotonic() + STARTED_WITHIN_S
    while not _is_assessed(loaded):
        if monotonic() > until_s:
            raise AgeWatchError(
                f"demo: no assessment within {STARTED_WITHIN_S:.0f} s{_last_words(loaded.folder)}"
            )
        _let_it_run(process, monotonic() + LOOK_EVERY_S, loaded.folder)


def _is_assessed(loaded: LoadedSettings) -> bool:
    try:
        with open_reader(loaded.settings.store.url, loaded.folder) as reader, reader.read() as view:
            return queries.latest_assessment_id(view) is not None
    except StoreError:
        return False  # the daemon has not made it yet


def _let_it_run(process: Process, until_s: float, folder: Path) -> None:
    """Wait until then. Raises AgeWatchError when the daemon ends before."""
    try:
        status = process.wait(max(0.0, until_s - monotonic()))
    except subprocess.TimeoutExpired:
        return
    raise _died(status, folder)


def _died(status: int, folder: Path) -> AgeWatchError:
    return AgeWatchError(f"demo: the daemon ended with status {status}{_last_words(folder)}")


def _last_words(folder: Path) -> str:
    lines = (folder / LOG).read_text(encoding="utf-8", errors="replace").splitlines()
    return "; its log ends: " + " | ".join(inert(one) for one in lines[-3:])


def _tell(loaded: LoadedSettings, received: Sequence[ReceivedMessage]) -> None:
    """Print what came of it. Raises AgeWatchError where something did not work."""
    with open_reader(loaded.settings.store.url, loaded.folder) as reader, reader.read() as view:
        assessment, alarms = queries.latest_assessment(view), queries.shown_alarms(view)
    if assessment is None or not len(assessment):
        raise AgeWatchError(f"demo: no coil was assessed{_last_words(loaded.folder)}")
    click.echo(summary(assessment, loaded.settings.site.timezone))
    click.echo(f"\nalarms: {len(alarms)}")
    for text in _alarm_lines(alarms):
        click.echo(text)
    signs = [message for message in received if message.verified and message.type == MessageType.HEARTBEAT]
    click.echo(
        f"\nmessages received: {len(received)}, of them {len(signs)} signs of life, verified, and these:"
    )
    for message in received:
        if message not in signs:
            click.echo(line(message))
    unverified = sum(not message.verified for message in received)
    if unverified:
        raise AgeWatchError(f"demo: {unverified} of {len(received)} messages do not verify")


def _alarm_lines(alarms: Sequence[Alarm]) -> Iterator[str]:
    rows = [(alarm.kind, alarm.subject, alarm.location, alarm.priority, alarm.state) for alarm in alarms]
    return text_table(("kind", "subject", "location", "priority", "state"), rows)
