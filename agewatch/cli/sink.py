"""`agewatch sink`: a receiver of messages, for trials."""

from __future__ import annotations

import json
import os
from collections.abc import Callable
from dataclasses import asdict
from pathlib import Path

import click

from agewatch.assemble import build_sink
from agewatch.cli.options import debug_option, form_options
from agewatch.clock import rfc3339
from agewatch.daemon.signals import EndingSignals
from agewatch.errors import UsageError
from agewatch.messages.received import ReceivedMessage, line
from agewatch.messages.sink import Sink


@click.command("sink")
@debug_option
@form_options(csv=False)
@click.option(
    "--port", type=click.IntRange(0, 65535), default=8080, show_default=True, help="0 takes a free one."
)
@click.option("--secret-env", metavar="NAME", help="Environment variable that holds the signing secret.")
@click.option("--secret-file", type=click.Path(path_type=Path), help="File that holds the signing secret.")
def command(as_json: bool, port: int, secret_env: str | None, secret_file: Path | None) -> None:
    """Receive messages on this computer, check their signatures, and print a line for each.

    Listens on loopback only, until it is interrupted. A message that comes again is marked.
    """
    with (
        EndingSignals() as signals,
        _listen(_secret(secret_env, secret_file), port, json_line if as_json else line) as sink,
    ):
        click.echo(f"receiving on {sink.url}", err=True)
        signals.wait()


def json_line(message: ReceivedMessage) -> str:
    """One message as one JSON object."""
    fields = asdict(message)
    received_s = fields.pop("received_s")
    return json.dumps({**fields, "received_at": rfc3339(received_s)})


def _listen(secret: str, port: int, form: Callable[[ReceivedMessage], str]) -> Sink:
    try:
        return build_sink([secret], port, lambda message: click.echo(form(message)))
    except OSError as fault:
        raise UsageError(f"port {port}: {fault.strerror}; give a free one with --port, or 0") from fault


def _secret(secret_env: str | None, secret_file: Path | None) -> str:
    if (secret_env is None) == (secret_file is None):
        raise UsageError("name the signing secret by either --secret-env or --secret-file")
    if secret_env is not None:
        if secret_env not in os.environ:
            raise UsageError(f"--secret-env names {secret_env}, which is not in the environment; set it")
        return os.environ[secret_env]
    try:
        return Path(str(secret_file)).read_text(encoding="ascii")
    except (OSError, UnicodeDecodeError) as fault:
        reason = fault.strerror if isinstance(fault, OSError) else "it is not plain text"
        raise UsageError(f"--secret-file {secret_file}: {reason}; put the signing secret there") from None
