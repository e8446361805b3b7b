"""Making a staged night the night that everyone sees: one transaction, all or nothing."""

from __future__ import annotations

import math
import time
from collections.abc import Mapping, Sequence
from contextlib import suppress
from dataclasses import replace
from pathlib import Path
from typing import Final

import sqlalchemy as sa

from swaygauge.errors import Busy, StoreError
from swaygauge.records import Alert, RuleResult
from swaygauge.store import queries
from swaygauge.store.catalog import Catalog, asking, delete_rows, insert_rows
from swaygauge.store.digest import night_digest
from swaygauge.store.layout import STUDIES
from swaygauge.store.rows import AlertRow, AliasRow, CheckRow, FactRow, NightRow
from swaygauge.store.schema import NIGHT

SWEEP_AGE_S: Final = 3600.0  # a younger file may belong to a run that is about to name it
OF_A_NIGHT: Final = ("part", "fact", "check_result", "alert", "staged_part", "staged_fact")


def publish(
    catalog: Catalog,
    row: NightRow,
    *,
    checks: Sequence[CheckRow],
    alerts: Sequence[AlertRow],
    aliases: Sequence[AliasRow] | None,
) -> NightRow:
    """Replace everything the night had by what is staged for it. The row comes back with its digest and new version.

    Raises Busy when the stored night is no longer the version that ``row`` was made from.
    """
    keys = [alert.key for alert in alerts]
    if len(set(keys)) < len(keys):
        twice = sorted({key for key in keys if keys.count(key) > 1})
        raise StoreError(
            f"{row.network}, night {row.night}: alert keys must differ, these are given twice: {twice[:5]}."
        )
    with catalog.writing() as connection:
        parts = queries.parts(asking(connection), row.network, row.night, staged=True)
        facts = queries.facts(asking(connection), row.network, row.night, staged=True)
        digest = night_digest(row, parts=parts, facts=facts, checks=checks, alerts=alerts)
        published = replace(row, digest=digest, version=row.version + 1)
        _replace_row(connection, row, published)
        for table in OF_A_NIGHT:
            delete_rows(connection, table, network=row.network, night=str(row.night))
        insert_rows(connection, "part", parts)
        insert_rows(connection, "fact", [FactRow(row.network, row.night, name, value) for name, value in facts.items()])
        insert_rows(connection, "check_result", checks)
        insert_rows(connection, "alert", alerts)
        if aliases is not None:
            delete_rows(connection, "alias", network=row.network)
            insert_rows(connection, "alias", aliases)
    return published


def _replace_row(connection: sa.Connection, read: NightRow, published: NightRow) -> None:
    """Put the new row where the one that was read stood. Raises Busy when that is no longer there."""
    place = sa.and_(NIGHT.c.network == read.network, NIGHT.c.night == str(read.night))
    stored = connection.scalar(sa.select(NIGHT.c.version).where(place).with_for_update())
    if (stored or 0) != read.version:
        raise Busy(
            f"{read.network}, night {read.night}: it was published meanwhile (version {stored or 0}, this run began "
            f"with {read.version}). Nothing was changed; run the night again."
        )
    connection.execute(sa.delete(NIGHT).where(place))
    try:
        insert_rows(connection, "night", [published])
    except sa.exc.IntegrityError as error:
        raise StoreError(f"{read.network}, night {read.night}: the catalog refuses the row: {error.orig}") from None


def check_rows(row: NightRow, results: Sequence[RuleResult]) -> list[CheckRow]:
    """The verdict's results as rows, in their order. A value that is no number (NaN) is kept as none."""
    return [
        CheckRow(
            network=row.network,
            night=row.night,
            position=position,
            rule=result.rule,
            column_name=result.column,
            value=result.value if result.value is not None and math.isfinite(result.value) else None,
            expected=result.expected,
            severity=result.severity,
            ok=result.ok,
            crashed=result.crashed,
        )
        for position, result in enumerate(results)
    ]


def alert_rows(
    row: NightRow, alerts: Sequence[Alert], node_names: Mapping[int, str], sentences: Mapping[str, str]
) -> list[AlertRow]:
    """Alerts as rows, in their order, with what is shown of them."""
    return [
        AlertRow(
            network=row.network,
            night=row.night,
            position=position,
            key=alert.key,
            kind=alert.kind,
            node=alert.node,
            node_name=node_names.get(alert.node, ""),
            score=alert.score,
            direction=alert.direction,
            rank_before=alert.rank_before,
            rank_now=alert.rank_now,
            size=alert.size,
            facts=alert.facts,
            sentence=sentences.get(alert.key, ""),
        )
        for position, alert in enumerate(alerts)
    ]


def orphans(catalog: Catalog, workspace: Path, network: str) -> list[Path]:
    """Files of the network's folder that no row names: left by a killed run, or replaced since. Sorted."""
    folder = workspace / network
    there = [path for path in folder.rglob("*") if path.is_file() and path.name != ".lock"]
    there = [path for path in there if path.parent != folder / STUDIES or path.name.startswith(".")]
    # staged before live: a night that is published in between moves from the first list to the second
    named = {part.path for staged in (True, False) for part in queries.all_parts(catalog.ask, network, staged=staged)}
    named |= {part.path for part in queries.name_parts(catalog.ask, network)}
    return sorted(path for path in there if path.relative_to(workspace).as_posix() not in named)


def sweep(catalog: Catalog, workspace: Path, network: str, *, age_s: float = SWEEP_AGE_S) -> int:
    """Remove orphans older than ``age_s`` seconds; how many."""
    oldest_kept = time.time() - age_s
    removed = 0
    for path in orphans(catalog, workspace, network):
        with suppress(FileNotFoundError):  # a file being written beside its place is renamed under our eyes
            if path.stat().st_mtime < oldest_kept:
                path.unlink()
                removed += 1
    return removed
