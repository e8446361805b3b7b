"""One network at work: its settings, its store, its files, and which nights are due."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from functools import lru_cache
from pathlib import Path

from swaygauge.config.settings import Settings, load_settings
from swaygauge.errors import InputError
from swaygauge.readers.aliases import Alias, read_aliases
from swaygauge.readers.nights import Found, file_of_night, find_snapshots
from swaygauge.store import Store
from swaygauge.store.rows import CHAINED, NightRow


@dataclass(frozen=True)
class Work:
    """What every stage of a night needs. Made by :func:`work_for`."""

    file: Path  # the TOML file
    settings: Settings
    store: Store

    @property
    def network(self) -> str:
        """The network's name in the store."""
        return self.settings.network

    @property
    def folder(self) -> Path:
        """The folder that snapshots arrive in."""
        return self.file.parent / self.settings.snapshots.folder

    def found(self) -> Found:
        """The dated snapshot files there are, the unclear ones, and the files that do not match the pattern."""
        return find_snapshots(self.folder, self.settings.snapshots.pattern)

    def beside(self, name: str) -> Path | None:
        """A file named in the settings, or None when none is named."""
        return self.file.parent / name if name else None

    def fetch_list(self, night: date) -> Path | None:
        """The list of sources really fetched on a night, when the network has such lists and this night's is there."""
        pattern = self.settings.snapshots.fetched
        return file_of_night(self.folder, pattern, night=night) if pattern else None

    def aliases(self) -> tuple[Alias, ...]:
        """The alias table, every line of it. Raises BadRows or MissingColumn for a bad table."""
        file = self.beside(self.settings.snapshots.aliases)
        return read_aliases(file, normalise=self.settings.reader.normalise_hosts) if file else ()

    def accepted_by_hand(self) -> dict[date, str]:
        """Nights that a person accepted although they were held, with the newest reason."""
        return {row.night: row.reason for row in self.store.acceptances(self.network)}


@lru_cache(maxsize=8)
def _work(file: Path, _stamp: tuple[int, int]) -> Work:
    settings = load_settings(file)
    workspace = (file.parent / settings.workspace).resolve()
    return Work(file=file, settings=settings, store=Store.open(workspace, url=settings.catalog or None))


def work_for(file: Path) -> Work:
    """The network that a TOML file describes; kept for the process as long as the file does not change.

    Raises ConfigError with every mistake in the file.
    """
    stamp = file.stat()
    return _work(file, (stamp.st_mtime_ns, stamp.st_size))


def side_digest(aliases: Sequence[Alias], night: date, lists: Sequence[Path | None]) -> str:
    """SHA-256 of what goes into a night beside the snapshot: aliases valid by then, fetch list, own importance."""
    told = [[alias.old, alias.new, alias.valid_from.isoformat()] for alias in aliases if alias.valid_from <= night]
    marks = [hashlib.sha256(path.read_bytes()).hexdigest() if path else "" for path in lists]
    return hashlib.sha256(json.dumps([told, marks]).encode()).hexdigest()


def side_digest_of(work: Work, night: date, aliases: Sequence[Alias]) -> str:
    """:func:`side_digest` for one night of a network."""
    beta = work.beside(work.settings.snapshots.beta)
    return side_digest(aliases, night, [work.fetch_list(night), beta])


def _same_file(path: Path, row: NightRow) -> bool:
    stat = path.stat()
    if stat.st_size != row.input_size or path.name != row.input_file:
        return False
    if stat.st_mtime_ns == row.input_mtime_ns:
        return True
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest() == row.input_sha256


def why_due(work: Work, night: date, path: Path, *, basis: str, aliases: Sequence[Alias], accepted: bool) -> str:
    """Why a night has to be run, in words, or "" when the store already holds what a run would give.

    basis: digest of the stored night before it, "" when there is none.
    """
    row = work.store.night_row(work.network, night)
    if row is None:
        return "not stored yet"
    if row.state not in (*CHAINED, "refused"):
        return "its file has arrived"
    if not _same_file(path, row):
        return "its file has changed"
    if row.settings_digest != work.settings.digest() and row.state != "published":
        return "the settings have changed"
    if row.state == "refused":
        return ""
    if row.basis != basis:
        return "a night before it has changed"
    if row.aliases_digest != side_digest_of(work, night, aliases):
        return "aliases, fetch list or own-importance values have changed"
    if accepted and row.state == "held":
        return "a person accepted it"
    return ""


def basis_of(work: Work, night: date) -> str:
    """Digest of the last stored night before this one: the end of the chain that this night continues."""
    rows = [row for row in work.store.nights(work.network) if row.night < night and row.state in CHAINED]
    return rows[-1].digest if rows else ""


@dataclass(frozen=True)
class Due:
    """A night that has to be run, and why."""

    night: date
    path: Path
    why: str


def due_nights(
    work: Work, *, start: date | None = None, end: date | None = None, again: bool = False
) -> Iterator[Due | InputError]:
    """Nights to run, in date order, each decided when its turn comes: what ran before may change what is due after.

    Unclear files (two for one night, no real date) are yielded first, as the errors they are; they stop no other night.
    """
    found = work.found()
    yield from found.problems
    aliases, by_hand = work.aliases(), work.accepted_by_hand()
    for night, path in found.nights.items():
        if (start and night < start) or (end and night > end):
            continue
        why = why_due(work, night, path, basis=basis_of(work, night), aliases=aliases, accepted=night in by_hand)
        if why or again:
            yield Due(night, path, why or "asked for again")


def overdue_nights(work: Work, now: datetime) -> tuple[date, ...]:
    """Nights whose deadline has passed without a file, after the newest night there is. Empty without a deadline."""
    deadline = work.settings.snapshots.deadline
    nights = list(work.found().nights)
    if not deadline or not nights:
        return ()
    hour, minute = (int(part) for part in deadline.split(":"))
    step = timedelta(days=work.settings.snapshots.every_nights)
    late = []
    night = nights[-1] + step
    while datetime(night.year, night.month, night.day, hour, minute, tzinfo=UTC) + timedelta(days=1) <= now:
        late.append(night)
        night += step
    return tuple(late)
