"""Where a network's settings and its stored nights are, read from the TOML file alone."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from swaygauge.errors import ConfigError
from swaygauge.store.layout import NAME


@dataclass(frozen=True)
class Place:
    """What a reading command needs to know of a network."""

    file: Path  # the TOML file
    network: str
    title: str
    workspace: Path
    catalog: str  # database url; "" = catalog.sqlite in the workspace
    attention: int  # alerts shown in full
    deadline: str  # "HH:MM" UTC of the next day by which a night should be in; "" = none
    every_nights: int


def find_file(network: str, folder: Path) -> Path:
    """The settings file for what a person typed: a path to a .toml file, or a name looked up in ``folder``.

    Raises ConfigError when there is no such file; the message lists the names there are.
    """
    typed = Path(network)
    if typed.suffix == ".toml":
        if typed.is_file():
            return typed
        raise ConfigError(str(typed), ["no such file. Give the path of a network's settings, or its name."])
    candidate = folder / f"{network}.toml"
    if NAME.fullmatch(network) and candidate.is_file():
        return candidate
    known = sorted(path.stem for path in folder.glob("*.toml")) if folder.is_dir() else []
    there = f"There is: {', '.join(known)}." if known else f"No *.toml file is in {folder}/."
    raise ConfigError(str(candidate), [f"no settings for a network called {network!r}. {there}"])


def read_toml(file: Path) -> dict[str, Any]:
    """The parsed file. Raises ConfigError when it is not TOML or not UTF-8."""
    try:
        with file.open("rb") as stream:
            return tomllib.load(stream)
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise ConfigError(str(file), [f"not valid TOML: {error}"]) from None
    except OSError as error:
        raise ConfigError(str(file), [f"cannot be read: {error.strerror}"]) from None


def _text(table: dict[str, Any], key: str, default: str = "") -> str:
    value = table.get(key, default)
    return value if isinstance(value, str) else default


def _count(table: Any, key: str, default: int) -> int:
    value = table.get(key, default) if isinstance(table, dict) else default
    return value if isinstance(value, int) and not isinstance(value, bool) and value > 0 else default


def read_place(file: Path) -> Place:
    """The network's name and workspace. Everything else in the file is left to ``settings``.

    Raises ConfigError when the name or the workspace is missing or impossible.
    """
    table = read_toml(file)
    network, workspace = table.get("network"), table.get("workspace")
    problems = []
    if not (isinstance(network, str) and NAME.fullmatch(network)):
        problems.append(f"network: expected a name of letters, digits, - and _ (at most 64), got {network!r}")
    if not (isinstance(workspace, str) and workspace):
        problems.append(f"workspace: expected the path of a folder, got {workspace!r}")
    if problems:
        raise ConfigError(str(file), problems)
    assert isinstance(network, str)
    assert isinstance(workspace, str)
    snapshots = table.get("snapshots", {})
    return Place(
        file=file,
        network=network,
        title=_text(table, "title", network),
        workspace=(file.parent / workspace).resolve(),
        catalog=_text(table, "catalog"),
        attention=_count(table.get("brief"), "attention", 20),
        deadline=_text(snapshots, "deadline") if isinstance(snapshots, dict) else "",
        every_nights=_count(snapshots, "every_nights", 1),
    )
