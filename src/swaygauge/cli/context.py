"""What commands share: which network, exit codes, errors as messages."""

from __future__ import annotations

import os
from collections.abc import Callable
from functools import wraps
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from swaygauge.cli.output import complain
from swaygauge.config.place import Place, find_file, read_place
from swaygauge.errors import Busy, ConfigError, Damaged, InputError, NotInStore, SwaygaugeError

if TYPE_CHECKING:
    from swaygauge.store import Reader

# Exit codes, part of the contract with whoever runs this from a script (README.md lists them)
FINE = 0
UNEXPECTED = 1
SETTINGS = 2
REFUSED = 3
HELD = 4
NOT_IN_STORE = 5
DAMAGED = 6
BUSY = 7

Network = Annotated[str, typer.Argument(help="Name of a network in the settings folder, or path of its .toml file.")]
AsJson = Annotated[bool, typer.Option("--json", help="Print one JSON document instead of text.")]


def settings_folder() -> Path:
    """Where networks are looked up by name: $SWAYGAUGE_SETTINGS, else config/ here."""
    return Path(os.environ.get("SWAYGAUGE_SETTINGS", "config"))


def place_of(network: str) -> Place:
    """Name or path -> the network's place."""
    return read_place(find_file(network, settings_folder()))


def reader_of(place: Place) -> Reader:
    """The stored nights of a network, read-only."""
    from swaygauge.store.reading import Reader

    return Reader.open(place.workspace, url=place.catalog or None)


def _code(error: SwaygaugeError) -> int:
    table: tuple[tuple[type[SwaygaugeError], int], ...] = (
        (ConfigError, SETTINGS),
        (InputError, REFUSED),
        (NotInStore, NOT_IN_STORE),
        (Damaged, DAMAGED),
        (Busy, BUSY),
    )
    return next((code for kind, code in table if isinstance(error, kind)), UNEXPECTED)


def guarded(command: Callable[..., Any]) -> Callable[..., Any]:
    """Errors that swaygauge raises on purpose become a message and an exit code; anything else stays a traceback."""

    @wraps(command)
    def run(*args: Any, **named: Any) -> None:
        try:
            command(*args, **named)
        except SwaygaugeError as error:
            complain(str(error))
            raise typer.Exit(_code(error)) from None

    return run
