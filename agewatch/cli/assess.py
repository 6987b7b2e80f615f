"""`agewatch assess`: every stored coil, evaluated once."""

from __future__ import annotations

from pathlib import Path

import click

from agewatch.assemble import assess_once, open_plant
from agewatch.cli import assessment_output as output
from agewatch.cli.options import OutputForm, Rfc3339, chosen_form, config_option, form_options
from agewatch.errors import FeedError, UsageError
from agewatch.plant.assessment import Assessment, Verdict

_FAILING = {
    "watch": ("watch", "pull", "hold"),
    "pull": ("pull", "hold"),
    "hold": ("hold",),
    "unassessed": ("unassessed",),
}
"""Which verdicts each choice of --fail-on takes for a finding."""


@click.command("assess")
@config_option
@form_options(csv=True)
@click.option("--at", "at_s", type=Rfc3339(), help="Time of the assessment; by default now.")
@click.option(
    "--store",
    "in_store",
    is_flag=True,
    help="Take the feeds into the plant's own store and keep the assessment there; the daemon must not run.",
)
@click.option(
    "--fail-on",
    type=click.Choice(list(_FAILING)),
    multiple=True,
    help="Exit with 1 when a coil has this verdict or, for watch and pull, a worse one. May be repeated.",
)
def command(
    config: Path, as_json: bool, as_csv: bool, at_s: float | None, in_store: bool, fail_on: tuple[str, ...]
) -> None:
    """Assess every stored coil once and print what was found.

    Reads the feeds into a scratch store and leaves the plant's own store alone, unless --store is given.

    Exit status: 0 done, 1 a finding that --fail-on asks for, 2 bad usage or settings, 3 a feed cannot be read.
    """
    form = chosen_form(as_json, as_csv)
    if in_store and at_s is not None:
        raise UsageError("--store and --at exclude each other: the store is to hold what is true now")
    plant = open_plant(config)
    found = assess_once(plant, at_s, in_store=in_store)
    for reading in found.readings:
        if reading.trouble:
            click.echo(f"agewatch: feed {reading.feed}: {reading.trouble}", err=True)
    _print(found.assessment, form, plant.settings.site.timezone)
    if any(reading.trouble for reading in found.readings):
        click.get_current_context().exit(FeedError.exit_status)
    if _is_finding(found.assessment, fail_on):
        click.get_current_context().exit(1)


def _print(assessment: Assessment, form: OutputForm, timezone: str) -> None:
    if form == "json":
        lines = output.json_lines(assessment)
    elif form == "csv":
        lines = output.csv_lines(assessment)
    else:
        lines = output.text_lines(assessment, timezone)
    for line in lines:
        click.echo(line)


def _is_finding(assessment: Assessment, fail_on: tuple[str, ...]) -> bool:
    failing = {verdict for choice in fail_on for verdict in _FAILING[choice]}
    return any(int(code) in assessment.verdict for code in Verdict if code.word in failing)
