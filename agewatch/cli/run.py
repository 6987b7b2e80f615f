"""`agewatch run`: the daemon, in the foreground; the service manager puts it elsewhere."""

from __future__ import annotations

import os
import sys
from pathlib import Path
from typing import Literal

import click

from agewatch.assemble import build_daemon, open_plant
from agewatch.cli import DEBUG
from agewatch.cli.options import config_option
from agewatch.daemon.logs import set_up_log
from agewatch.daemon.notify import Notify
from agewatch.daemon.run import run
from agewatch.daemon.signals import EndingSignals


@click.command("run")
@config_option
@click.option("--log", type=click.Choice(["text", "json"]), default="text", help="Form of the log on stderr.")
@click.option(
    "--while-stdin", is_flag=True, help="End when standard input ends, as with the program that began it."
)
def command(config: Path, log: Literal["text", "json"], while_stdin: bool) -> None:
    """Run the daemon: read the feeds, assess, move the alarms on, deliver messages.

    It is the only writer of its store, and ends cleanly at SIGTERM or SIGINT.
    """
    loaded = open_plant(config)
    set_up_log(log, debug=bool(click.get_current_context().meta.get(DEBUG)))
    with EndingSignals(sys.stdin.fileno() if while_stdin else None) as signals:
        run(build_daemon(loaded, os.environ), Notify(os.environ), signals)
