"""All settings of one network, checked at once.

The option types live beside the code that uses them; this module only gathers them, so a new option appears here by
itself. Types and ranges are checked by pydantic; what needs a second look (does the folder exist, does the pattern
carry the night) is checked in :func:`_second_look`. Every mistake is reported together, each with key path, value and
expectation.
"""

from __future__ import annotations

import dataclasses
import hashlib
import json
import re
import zoneinfo
from dataclasses import dataclass, field
from pathlib import Path
from typing import Annotated, Any, ClassVar

from annotated_types import Ge
from pydantic import ConfigDict, TypeAdapter, ValidationError

from swaygauge.checks.limits import Limits
from swaygauge.config.place import read_toml
from swaygauge.detect import Thresholds
from swaygauge.effective import UpkeepOptions
from swaygauge.errors import ConfigError, UnclearNight
from swaygauge.readers.nights import check_pattern
from swaygauge.readers.options import ReadOptions
from swaygauge.readers.options import problems as reader_problems
from swaygauge.scores import FairshareOptions, KatzOptions
from swaygauge.store.layout import NAME


@dataclass(frozen=True)
class SnapshotOptions:
    """Where snapshots arrive and what comes with them. Paths are relative to the TOML file."""

    folder: str  # the folder that snapshots arrive in
    pattern: str = "links-{night}.csv.gz"  # how a file name carries its night
    every_nights: Annotated[int, Ge(1)] = 1  # nights between two snapshots: 1 nightly, 7 weekly
    deadline: str = ""  # "HH:MM" UTC of the day after by which a night should be in; "" = never overdue
    fetched: str = ""  # pattern of per-night files that list the sources really fetched; "" = inferred
    aliases: str = ""  # CSV old,new,valid_from of renames and merges
    beta: str = ""  # CSV name,value of per-node own importance; "" = the score's own beta for every node


@dataclass(frozen=True)
class ScoreOptions:
    """The two scores that are always computed, and how deep the network as a whole is compared."""

    katz: KatzOptions = field(default_factory=KatzOptions)
    fairshare: FairshareOptions = field(default_factory=FairshareOptions)
    top: Annotated[int, Ge(1)] = 100  # places of the network-level comparison


@dataclass(frozen=True)
class BriefOptions:
    """The morning brief."""

    attention: Annotated[int, Ge(1)] = 20  # alerts shown in full; the rest is counted and listed on request


@dataclass(frozen=True)
class ScheduleOptions:
    """When ``swaygauge schedule`` runs the night."""

    cron: str = "15 2 * * *"  # minute, hour, day of month, month, day of week
    timezone: str = "UTC"  # IANA name of the zone that the cron line is in


@dataclass(frozen=True)
class Settings:
    """Everything one network's TOML file says, checked."""

    __pydantic_config__: ClassVar[ConfigDict] = ConfigDict(extra="forbid", strict=True)

    network: str  # its name in the workspace: letters, digits, - and _
    workspace: str  # folder of the stored nights
    snapshots: SnapshotOptions
    title: str = ""  # printed above the brief; "" = the name of the network
    catalog: str = ""  # database url of a shared catalog; "" = catalog.sqlite in the workspace
    reader: ReadOptions = field(default_factory=ReadOptions)
    checks: Limits = field(default_factory=Limits)
    upkeep: UpkeepOptions = field(default_factory=UpkeepOptions)
    scores: ScoreOptions = field(default_factory=ScoreOptions)
    alerts: Thresholds = field(default_factory=Thresholds)
    brief: BriefOptions = field(default_factory=BriefOptions)
    schedule: ScheduleOptions = field(default_factory=ScheduleOptions)

    def digest(self) -> str:
        """SHA-256 of every setting that can change a stored number; where files lie and when to run is left out."""
        told = dataclasses.asdict(self)
        for key in ("workspace", "title", "catalog", "brief", "schedule"):
            del told[key]
        told["snapshots"] = {"every_nights": self.snapshots.every_nights}
        return hashlib.sha256(json.dumps(told, sort_keys=True).encode()).hexdigest()


def _path_of(location: tuple[int | str, ...], table: dict[str, Any]) -> str:
    """The key path a person wrote: pydantic appends the tried type of a union, which no TOML file holds."""
    parts: list[str] = []
    here: Any = table
    for part in location:
        if isinstance(here, dict) and part not in here and parts and not isinstance(part, int):
            missing_leaf = part == location[-1] and str(part).isidentifier()
            if not missing_leaf:
                break
        elif not isinstance(here, dict | list) and parts:
            break
        parts.append(str(part))
        here = here[part] if isinstance(here, dict) and part in here else None
    return ".".join(parts)


_ADAPTER: TypeAdapter[Settings] = TypeAdapter(Settings)


def _type_problems(error: ValidationError, table: dict[str, Any]) -> list[str]:
    told: dict[str, list[str]] = {}
    for item in error.errors(include_url=False):
        path = _path_of(item["loc"], table)
        if item["type"] in ("unexpected_keyword_argument", "extra_forbidden"):
            told.setdefault(path, []).append("no such setting; remove it or correct its spelling")
        elif item["type"] == "missing":
            told.setdefault(path, []).append("is required and missing")
        else:
            expected = item["msg"].removeprefix("Input should be ")
            told.setdefault(path, []).append(f"expected {expected}, got {item['input']!r}")
    return [f"{path}: {'; or '.join(dict.fromkeys(texts))}" for path, texts in told.items()]


def _second_look(settings: Settings, base: Path) -> list[str]:
    problems = []

    def need(ok: bool, text: str) -> None:
        if not ok:
            problems.append(text)

    need(
        bool(NAME.fullmatch(settings.network)),
        f"network: expected a name of letters, digits, - and _ (at most 64), got {settings.network!r}",
    )
    need(bool(settings.workspace), "workspace: expected the path of a folder, got ''")
    snapshots = settings.snapshots
    folder = base / snapshots.folder
    need(folder.is_dir(), f"snapshots.folder: expected an existing folder, got {snapshots.folder!r} (looked in {base})")
    for key in ("pattern", "fetched"):
        pattern = getattr(snapshots, key)
        if pattern or key == "pattern":
            try:
                check_pattern(pattern)
            except UnclearNight as error:
                problems.append(f"snapshots.{key}: {error}")
    problems.extend(f"reader.{problem}" for problem in reader_problems(settings.reader))
    for key in ("aliases", "beta"):
        file = getattr(snapshots, key)
        need(not file or (base / file).is_file(), f"snapshots.{key}: expected an existing file, got {file!r}")
    need(
        not snapshots.deadline or bool(re.fullmatch(r"([01]\d|2[0-3]):[0-5]\d", snapshots.deadline)),
        f"snapshots.deadline: expected a time of day like '06:00' or '', got {snapshots.deadline!r}",
    )
    katz = settings.scores.katz
    need(
        katz.share < katz.limit,
        f"scores.katz.share: expected less than scores.katz.limit ({katz.limit}), got {katz.share}",
    )
    need(
        len(settings.schedule.cron.split()) == 5,
        f"schedule.cron: expected five fields such as '15 2 * * *', got {settings.schedule.cron!r}",
    )
    need(
        settings.schedule.timezone in zoneinfo.available_timezones(),
        f"schedule.timezone: expected an IANA zone such as 'UTC', got {settings.schedule.timezone!r}",
    )
    return problems


def load_settings(file: Path) -> Settings:
    """The checked settings of one network.

    Raises ConfigError with every mistake found, each with its key path, the value and what was expected.
    """
    table = read_toml(file)
    try:
        # JSON mode is strict about types yet takes a table for an option type and an array for a tuple
        settings = _ADAPTER.validate_json(json.dumps(table, default=str), strict=True)
    except ValidationError as error:
        raise ConfigError(str(file), _type_problems(error, table)) from None
    problems = _second_look(settings, file.parent)
    if problems:
        raise ConfigError(str(file), problems)
    return settings
