"""Is the workspace what its catalog says it is? All of it is looked at; nothing is changed."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from datetime import date

import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.parquet as pq

from swaygauge.errors import Damaged
from swaygauge.store import queries
from swaygauge.store.digest import night_digest
from swaygauge.store.layout import check_name
from swaygauge.store.names import read_name_part
from swaygauge.store.publishing import orphans
from swaygauge.store.rows import CHAINED, NightRow
from swaygauge.store.staging import read_part_bytes
from swaygauge.store.views import Finding
from swaygauge.store.writing import Store


def checkup(store: Store, network: str, *, progress: Callable[[str], None] = lambda _: None) -> list[Finding]:
    """What is not as it should be, worst first; an empty list when all is well.

    Every part is read and its hash compared, every night's digest is computed again, the name table must be dense and
    without repetition. progress: called with each thing before it is looked at. Hold the network's lock around it: a
    night that is being published just now would look as if it were damaged.
    """
    check_name(network)
    found: list[Finding] = []
    for look in (_catalog, _names, _parts, _chain, _leftovers):
        progress(look.__name__.strip("_"))
        found.extend(look(store, network))
    return sorted(found, key=lambda finding: ("damaged", "stale", "note").index(finding.level))


def _catalog(store: Store, network: str) -> Iterator[Finding]:
    """SQLite's own look at its file (PostgreSQL keeps its own house)."""
    if store.catalog.is_sqlite:
        for (problem,) in store.catalog.ask("PRAGMA integrity_check"):
            if problem != "ok":
                yield Finding("damaged", None, f"the catalog of {network}: {problem}.", "Restore it from a backup.")


def _parts(store: Store, network: str) -> Iterator[Finding]:
    for part in queries.all_parts(store.catalog.ask, network):
        what = f"{network}, night {part.night}, {' '.join(word for word in (part.kind, part.score) if word)}"
        todo = f"Run night {part.night} of {network} again, or restore the file from a backup."
        try:
            data = read_part_bytes(store.workspace, part, what)
        except Damaged as damage:
            yield Finding("damaged", part.night, str(damage), todo)
            continue
        rows = pq.read_metadata(pa.BufferReader(data)).num_rows
        if rows != part.rows:
            yield Finding("damaged", part.night, f"{what}: {rows} rows, the catalog says {part.rows}.", todo)


def _names(store: Store, network: str) -> Iterator[Finding]:
    """Ids must be 0, 1, 2, ... over all parts, every name there once."""
    backup = "Restore the name table from a backup: ids cannot be made again."
    texts, expected = [], 0
    for part in queries.name_parts(store.catalog.ask, network):
        if part.first != expected:
            what = f"{network}: the name table has ids up to {expected - 1}, then goes on with {part.first}."
            yield Finding("damaged", None, what, backup)
        expected = part.first + part.rows
        try:
            table = read_name_part(store.workspace, part)
        except Damaged as damage:
            yield Finding("damaged", None, str(damage), backup)
            continue
        ids = table.column("id").to_numpy()
        if len(ids) != part.rows or (len(ids) and (ids != range(part.first, expected)).any()):
            yield Finding(
                "damaged", None, f"{network}: {part.path} does not hold ids {part.first} to {expected - 1}.", backup
            )
        texts.append(table.column("name").cast(pa.large_string()))
    if texts:
        counts = pc.value_counts(pa.chunked_array([chunk for text in texts for chunk in text.chunks]))
        twice = counts.filter(pc.greater(counts.field("counts"), 1))
        if len(twice):
            example = twice.field("values")[0].as_py()
            what = f"{network}: {len(twice)} names have more than one id, {example[:80]!r} among them."
            yield Finding("damaged", None, what, backup)


def _chain(store: Store, network: str) -> Iterator[Finding]:
    """Each night's digest follows from what the catalog holds, its basis is the digest of the stored night before."""
    ask = store.catalog.ask
    nights = {row.night: row for row in queries.nights(ask, network)}
    last: NightRow | None = None
    for night, row in nights.items():
        digest = night_digest(
            row,
            parts=queries.parts(ask, network, night),
            facts=queries.facts(ask, network, night),
            checks=queries.checks(ask, network, night),
            alerts=queries.alerts(ask, network, first=night, last=night),
        )
        if digest != row.digest:
            what = f"{network}, night {night}: the catalog's rows do not give the digest that was published with them."
            yield Finding("damaged", night, what, f"Run night {night} of {network} again.")
        if row.state in CHAINED:
            yield from _rests_on(row, last, nights)
            last = row


def _rests_on(row: NightRow, last: NightRow | None, nights: Mapping[date, NightRow]) -> Iterator[Finding]:
    where = f"{row.network}, night {row.night}"
    todo = f"Run the nights of {row.network} from {row.night} on again."
    if row.previous is not None and row.previous not in nights:
        yield Finding("damaged", row.night, f"{where}: rests on night {row.previous}, which is not in the store.", todo)
    elif row.basis != (last.digest if last else ""):
        before = f"night {last.night}, which was published again since" if last else "a night that is gone"
        yield Finding("stale", row.night, f"{where}: rests on an earlier version of {before}.", todo)


def _leftovers(store: Store, network: str) -> Iterator[Finding]:
    for night in queries.staged_nights(store.catalog.ask, network):
        what = f"{network}, night {night}: begun and not published; what was there before still stands."
        yield Finding("note", night, what, f"Run night {night} of {network} again.")
    files = orphans(store.catalog, store.workspace, network)
    if files:
        size = sum(path.stat().st_size for path in files)
        example = files[0].relative_to(store.workspace)
        what = f"{network}: {len(files)} files that no row names ({size} bytes), {example} among them."
        yield Finding("note", None, what, "Nothing to do: the next run removes those older than an hour.")
