"""`agewatch board`: the supervisor's screen."""

from __future__ import annotations

from pathlib import Path

import click

from agewatch.assemble import build_board, open_plant
from agewatch.cli.options import config_option


@click.command("board")
@config_option
def command(config: Path) -> None:
    """Show the store and the alarms to the people on shift.

    Reads the store and never writes it; what is asked for here, the daemon does.
    """
    build_board(open_plant(config)).run()
