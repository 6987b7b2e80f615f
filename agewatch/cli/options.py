"""Options that several commands share."""

from __future__ import annotations

from collections.abc import Callable
from datetime import datetime
from pathlib import Path
from typing import Any, Literal, TypeVar

import click

from agewatch.cli import DEBUG
from agewatch.errors import UsageError

Decorated = TypeVar("Decorated", bound=Callable[..., Any])

OutputForm = Literal["text", "json", "csv"]


class Rfc3339(click.ParamType[float]):
    """A time with its offset; becomes seconds since 1970."""

    name = "RFC3339"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        if isinstance(value, float):
            return value
        try:
            at = datetime.fromisoformat(value)
        except ValueError:
            at = None
        if at is None or at.tzinfo is None:
            self.fail(f"{value!r} is no RFC 3339 time; write for example 2026-07-18T05:30:00Z", param, ctx)
        return at.timestamp()


def config_option(function: Decorated) -> Decorated:
    """`--config`, and `--debug` that goes with everything."""
    function = click.option(
        "--config",
        type=click.Path(path_type=Path),
        envvar="AGEWATCH_CONFIG",
        default=Path("config/plant.toml"),
        help="Settings of the plant; by default $AGEWATCH_CONFIG, then ./config/plant.toml.",
    )(function)
    return debug_option(function)


def debug_option(function: Decorated) -> Decorated:
    """`--debug`: tracebacks of errors."""
    return click.option(
        "--debug",
        is_flag=True,
        expose_value=False,
        callback=_remember_debug,
        help="Show where in the program an error came from.",
    )(function)


def form_options(*, csv: bool) -> Callable[[Decorated], Decorated]:
    """`--json`, and `--csv` where it makes sense."""

    def decorate(function: Decorated) -> Decorated:
        if csv:
            function = click.option("--csv", "as_csv", is_flag=True, help="Print one CSV table.")(function)
        return click.option("--json", "as_json", is_flag=True, help="Print one JSON document.")(function)

    return decorate


def chosen_form(as_json: bool, as_csv: bool = False) -> OutputForm:
    """The one form asked for. Raises UsageError where both are."""
    if as_json and as_csv:
        raise UsageError("--json and --csv exclude each other; give one of them")
    return "json" if as_json else "csv" if as_csv else "text"


def _remember_debug(ctx: click.Context, _: click.Parameter, value: bool) -> None:
    ctx.meta[DEBUG] = value
