"""The Store: what the night loads from and saves to. Each method leaves the work to one function."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from contextlib import AbstractContextManager
from datetime import UTC, date, datetime
from pathlib import Path
from types import TracebackType
from typing import Any, Self, TypeVar

import sqlalchemy as sa

from swaygauge.errors import NotInStore
from swaygauge.records import Alert, RuleResult, RunReport
from swaygauge.store import publishing, queries, staging
from swaygauge.store.catalog import Catalog, asking, delete_rows, hold_network_row, insert_rows, utc_now
from swaygauge.store.layout import check_name
from swaygauge.store.lock import hold_network
from swaygauge.store.names import NameTable
from swaygauge.store.parquet import Columns
from swaygauge.store.recordform import put_together, take_apart
from swaygauge.store.rows import AcceptanceRow, AliasRow, NightRow, RunRow
from swaygauge.store.schema import NETWORK

Record = TypeVar("Record")


class Store:
    """One workspace. Open with :meth:`open`; hold :meth:`lock` while a night is made.

    A night is staged piece by piece (``stage_*``), read back with ``staged=True``, and becomes visible as a whole with
    :meth:`publish`. A run that is killed leaves the night that was there before.
    """

    def __init__(self, workspace: Path, catalog: Catalog) -> None:
        self.workspace = workspace
        self.catalog = catalog
        self._names: dict[str, NameTable] = {}
        self._ready: set[str] = set()

    @classmethod
    def open(cls, workspace: Path, *, url: str | None = None) -> Store:
        """Open a workspace, creating it or bringing its schema up to date.

        url: a shared catalog, e.g. ``postgresql+psycopg://...``; by default ``catalog.sqlite`` in the folder.
        Raises StoreError when a newer version made it or it cannot be used.
        """
        workspace = workspace.absolute()
        return cls(workspace, Catalog(workspace, url=url))

    def close(self) -> None:
        """Close the catalog's connections."""
        self.catalog.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def lock(self, network: str) -> AbstractContextManager[None]:
        """Hold the network for one run. Entering raises Busy when another holds it; dying frees it."""
        return hold_network(self.catalog, self.workspace, check_name(network))

    def names(self, network: str) -> NameTable:
        """The network's name table, kept in memory as long as the store is open."""
        self._add_network(network)
        return self._names.setdefault(network, NameTable(self.catalog, self.workspace, network))

    # ---- one night under construction

    def stage_part(
        self, network: str, night: date, *, kind: str, columns: Columns, score: str = "", ragged: bool = False
    ) -> None:
        """Stage columns of one length; with ``ragged``, arrays of any lengths. Replaces a part staged before.

        Raises StoreError for anything but 1-D arrays of numbers or flags.
        """
        self._add_network(network)
        staging.stage_part(
            self.catalog, self.workspace, network, night, kind=kind, score=score, columns=columns, ragged=ragged
        )

    def stage_fact(self, network: str, night: date, *, name: str, value: Any) -> None:
        """Stage a small JSON document. Raises StoreError for NaN, infinities and what JSON has no form for."""
        self._add_network(network)
        staging.stage_fact(self.catalog, network, night, name=name, value=value)

    def stage_record(self, network: str, night: date, *, kind: str, record: Any, score: str = "") -> None:
        """Stage a record: its arrays as the part ``kind``, the rest as the fact ``kind`` or ``kind.score``."""
        arrays, rest = take_apart(record)
        if arrays:
            ragged = len({len(array) for array in arrays.values()}) > 1
            self.stage_part(network, night, kind=kind, columns=arrays, score=score, ragged=ragged)
        self.stage_fact(network, night, name=_fact_of(kind, score), value=rest)

    def clear_staging(self, network: str, night: date) -> None:
        """Forget what the night has staged."""
        staging.clear_staging(self.catalog, check_name(network), night)

    def publish(
        self,
        row: NightRow,
        *,
        checks: Sequence[RuleResult] = (),
        alerts: Sequence[Alert] = (),
        node_names: Mapping[int, str] | None = None,
        sentences: Mapping[str, str] | None = None,
        aliases: Sequence[AliasRow] | None = None,
    ) -> NightRow:
        """Replace the night by what is staged for it, in one transaction; the row returns with digest and version.

        row: its ``version`` is that of the row it replaces, 0 for a new night. node_names: node -> the name shown, for
        every alerted node. sentences: alert key -> its sentence. aliases: the network's whole table; None leaves it.
        Raises Busy when the night was published meanwhile. Files that it makes superfluous stay until :meth:`sweep`.
        """
        self._add_network(row.network)
        return publishing.publish(
            self.catalog,
            row,
            checks=publishing.check_rows(row, checks),
            alerts=publishing.alert_rows(row, alerts, node_names or {}, sentences or {}),
            aliases=aliases,
        )

    def sweep(self, network: str) -> int:
        """Remove the network's files that no row has named for an hour; how many."""
        return publishing.sweep(self.catalog, self.workspace, check_name(network))

    # ---- reading back

    def part(self, network: str, night: date, *, kind: str, score: str = "", staged: bool = False) -> dict[str, Any]:
        """The columns of a part as read-only arrays. Raises NotInStore, or Damaged when the bytes differ."""
        return staging.read_part(self.catalog, self.workspace, network, night, kind=kind, score=score, staged=staged)

    def has_part(self, network: str, night: date, *, kind: str, score: str = "", staged: bool = False) -> bool:
        """Whether the night has such a part."""
        return queries.part(self.catalog.ask, network, night, kind, score, staged=staged) is not None

    def record(
        self,
        cls: type[Record],
        network: str,
        night: date,
        *,
        kind: str,
        score: str = "",
        staged: bool = False,
    ) -> Record:
        """The record that :meth:`stage_record` kept. Raises NotInStore, Damaged."""
        rest = self.fact(network, night, name=_fact_of(kind, score), staged=staged)
        has_arrays = self.has_part(network, night, kind=kind, score=score, staged=staged)
        arrays = self.part(network, night, kind=kind, score=score, staged=staged) if has_arrays else {}
        return put_together(cls, arrays, rest)

    def fact(self, network: str, night: date, *, name: str, staged: bool = False) -> Any:
        """One fact of one night. Raises NotInStore."""
        facts = queries.facts(self.catalog.ask, network, night, staged=staged)
        if name not in facts:
            raise NotInStore(f"{network}, night {night}: no fact {name!r} {'is staged' if staged else 'in the store'}.")
        return facts[name]

    def facts(self, network: str, *, name: str, nights: Sequence[date]) -> dict[date, Any]:
        """One fact over nights, in date order; nights without it are left out."""
        return queries.fact_over_nights(self.catalog.ask, network, name, nights)

    def records(self, cls: type[Record], network: str, nights: Sequence[date], *, kind: str) -> dict[date, Record]:
        """Records without arrays over nights, in date order; nights without one are left out. Raises Damaged."""
        return {
            night: put_together(cls, {}, rest) for night, rest in self.facts(network, name=kind, nights=nights).items()
        }

    def networks(self) -> tuple[str, ...]:
        """Names of all networks, sorted."""
        return queries.networks(self.catalog.ask)

    def nights(self, network: str) -> tuple[NightRow, ...]:
        """All nights, of every state, in date order."""
        return queries.nights(self.catalog.ask, network)

    def night_row(self, network: str, night: date) -> NightRow | None:
        """One night, or None."""
        return queries.night(self.catalog.ask, network, night)

    def last_accepted(self, network: str, *, before: date) -> NightRow | None:
        """The newest accepted night before a date, or None."""
        found = self.accepted_nights(network, before=before, last=1)
        return found[0] if found else None

    def accepted_nights(self, network: str, *, before: date, last: int | None = None) -> tuple[NightRow, ...]:
        """The newest ``last`` accepted nights before a date, in date order."""
        return queries.accepted_nights(self.catalog.ask, network, before=before, last=last)

    # ---- journals

    def accept(self, network: str, night: date, *, reason: str, who: str, at: str | None = None) -> AcceptanceRow:
        """Note that a person lets a held night count. The night itself changes when it is run again.

        at: the time, UTC; now by default. Raises NotInStore when there is no such night.
        """
        with self.catalog.writing() as connection:
            hold_network_row(connection, network)
            earlier = queries.acceptances(asking(connection), network)
            if queries.night(asking(connection), network, night) is None:
                raise NotInStore(f"{network}: night {night} is not in the store, so there is nothing to accept.")
            row = AcceptanceRow(network, len(earlier) + 1, night, reason, who, at or utc_now())
            insert_rows(connection, "acceptance", [row])
        return row

    def acceptances(self, network: str) -> tuple[AcceptanceRow, ...]:
        """Every acceptance in the order it was made."""
        return queries.acceptances(self.catalog.ask, network)

    def record_run(self, report: RunReport, *, started: datetime, finished: datetime) -> None:
        """Keep a run's report, replacing one of the same run id. Times must carry their zone."""
        _, told = take_apart(report)
        row = RunRow(
            run_id=report.run_id,
            network=report.network,
            night=report.night,
            outcome=report.outcome,
            started=started.astimezone(UTC).isoformat(timespec="milliseconds"),
            finished=finished.astimezone(UTC).isoformat(timespec="milliseconds"),
            report=told,
        )
        with self.catalog.writing() as connection:
            delete_rows(connection, "run", run_id=row.run_id)
            insert_rows(connection, "run", [row])

    def _add_network(self, network: str) -> None:
        if network in self._ready:
            return
        check_name(network)
        with self.catalog.writing() as connection:
            known = connection.execute(sa.select(NETWORK.c.name).where(NETWORK.c.name == network)).first()
            if known is None:
                connection.execute(sa.insert(NETWORK).values(name=network, created=utc_now()))
        self._ready.add(network)


def _fact_of(kind: str, score: str) -> str:
    return f"{kind}.{score}" if score else kind
