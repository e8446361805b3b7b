"""The terminal: parses, calls, prints. Heavy libraries are imported inside the commands that need them."""

from __future__ import annotations

import typer

from swaygauge.cli import demo, reading, running, studying
from swaygauge.cli.context import guarded

app = typer.Typer(
    name="swaygauge",
    help="Who gained or lost standing in a network last night, whether the snapshot can be trusted, and why.",
    no_args_is_help=True,
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
)
settings = typer.Typer(help="The settings of a network.", no_args_is_help=True)
app.add_typer(settings, name="config")

for command in (
    reading.brief,
    reading.standing,
    reading.moves,
    reading.alerts,
    reading.trace,
    reading.nights,
    running.night,
    running.backfill,
    running.schedule,
    running.checkup,
    studying.tune,
    studying.steadiness,
    demo.demo,
):
    app.command()(guarded(command))
settings.command("check")(guarded(running.config_check))


def main() -> None:
    """Entry point of the ``swaygauge`` command."""
    app()
