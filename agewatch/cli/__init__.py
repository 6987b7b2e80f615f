"""The command line: parse, call, print. A command is imported when it runs, so that help comes at once.

Exit status: 0 done, 1 a finding, 2 bad usage or settings, 3 store or feed trouble.
"""

from __future__ import annotations

import os
import sys
import traceback
from importlib import import_module
from typing import Any, NoReturn

import click

from agewatch import __version__
from agewatch.errors import AgeWatchError

COMMANDS = {
    "demo": "Show the whole job on an invented plant.",
    "run": "Run the daemon: read, assess, alarm, deliver.",
    "board": "Show the store and the alarms to the people on shift.",
    "assess": "Assess every stored coil once and print what was found.",
    "check": "Read settings and feeds and tell all that is wrong with them.",
    "rejects": "List, export and submit again the rows that could not be used.",
    "sink": "Receive messages on this computer, for trials.",
}
"""Name and first sentence of every command; its code is `command` in the module of its name."""

DEBUG = "agewatch.debug"
"""Key in click's meta: whether tracebacks are wanted."""

_INTERRUPTED = 130


class _Commands(click.Group):
    """Commands in the order of `COMMANDS`; errors become one line and an exit status here."""

    def list_commands(self, _: click.Context) -> list[str]:
        return list(COMMANDS)

    def get_command(self, _: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in COMMANDS:
            return None
        command = import_module(f"agewatch.cli.{cmd_name}").command
        if not isinstance(command, click.Command):
            raise TypeError(f"agewatch.cli.{cmd_name}.command is no command")
        return command

    def format_commands(self, _: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))

    def invoke(self, ctx: click.Context) -> Any:
        try:
            return super().invoke(ctx)
        except AgeWatchError as error:
            self._trace(ctx)
            _complain(str(error))
            ctx.exit(error.exit_status)
        except (click.ClickException, click.exceptions.Exit, click.Abort, BrokenPipeError):
            raise
        except Exception as error:
            self._trace(ctx)
            _complain(
                f"this should not happen: {type(error).__name__}: {error}; repeat it with --debug, report it"
            )
            ctx.exit(AgeWatchError.exit_status + 2)

    def _trace(self, ctx: click.Context) -> None:
        if ctx.meta.get(DEBUG):
            traceback.print_exc()


@click.group(cls=_Commands, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="agewatch", message="%(prog)s %(version)s")
def agewatch() -> None:
    """Watch steel coils age in store, and tell which will show stretcher strains before they are pressed.

    The dates are estimates: they replace neither a tensile test of the coil (ISO 6892-1), nor the order's
    quality terms, nor the site's rules for lifting and moving coils.
    """


def main(arguments: list[str] | None = None) -> NoReturn:
    """Run one command and exit."""
    try:
        status = agewatch.main(arguments, prog_name="agewatch", standalone_mode=False)
    except click.exceptions.NoArgsIsHelpError as error:
        error.show()
        status = error.exit_code
    except click.ClickException as error:
        where = error.ctx.command_path if isinstance(error, click.UsageError) and error.ctx else "agewatch"
        _complain(f"{error.format_message()}  (see `{where} --help`)")
        status = error.exit_code
    except click.Abort:
        status = _INTERRUPTED
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())  # the reader has seen enough
        status = 0
    sys.exit(status if isinstance(status, int) else 0)


def _complain(message: str) -> None:
    for line in message.splitlines():
        click.echo(f"agewatch: {line}", err=True)
