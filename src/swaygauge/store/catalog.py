"""The catalog database: SQLite in the workspace, or PostgreSQL by url; opening it brings its schema up to date.

SQLite runs in WAL mode, where readers and one writer never wait for each other. A transaction that writes says so at
its start (BEGIN IMMEDIATE): one that reads first and writes later could decide on what another process is changing.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, Final

import sqlalchemy as sa
from sqlalchemy.exc import ArgumentError, DBAPIError, IntegrityError, OperationalError

from swaygauge.errors import Busy, NotInStore, StoreError
from swaygauge.store import queries
from swaygauge.store.files import make_folder
from swaygauge.store.layout import CATALOG
from swaygauge.store.migrations import MIGRATIONS, Migration, refuse_newer
from swaygauge.store.rows import to_database
from swaygauge.store.schema import MIGRATION, NETWORK, ROW_TABLES

WAIT_MS: Final = 30_000  # how long a writer waits for another writer
# FULL: a commit is on disk before a file that it made superfluous is removed
PRAGMAS: Final = (f"busy_timeout={WAIT_MS}", "journal_mode=WAL", "synchronous=FULL", "foreign_keys=ON")
MIGRATION_LOCK: Final = 0x73776179  # any constant: PostgreSQL's advisory lock while the schema changes


def utc_now() -> str:
    """The time as the catalog writes it: UTC, ISO, to the second."""
    return datetime.now(UTC).isoformat(timespec="seconds")


class Catalog:
    """Connections and transactions. Every statement of the store goes through here."""

    def __init__(
        self, workspace: Path, *, url: str | None = None, migrations: Sequence[Migration] = MIGRATIONS
    ) -> None:
        make_folder(workspace)
        try:
            address = sa.make_url(url) if url else sa.URL.create("sqlite", database=str(workspace / CATALOG))
            self._engine = sa.create_engine(address)
        except (ArgumentError, ImportError) as error:
            raise StoreError(f"the catalog's address cannot be used: {error}") from None
        self.where = address.render_as_string(hide_password=True)
        self.is_sqlite = self._engine.dialect.name == "sqlite"
        if self.is_sqlite:
            sa.event.listen(self._engine, "connect", _set_up_sqlite)
            sa.event.listen(self._engine, "begin", _begin_sqlite)
        try:
            self._migrate(migrations)
        except BaseException:
            self.close()
            raise

    def close(self) -> None:
        """Close every connection."""
        self._engine.dispose()

    @contextmanager
    def writing(self) -> Iterator[sa.Connection]:
        """One transaction that writes: all of it happens, or nothing. Raises Busy when another writer does not end."""
        with self._connection(writes=True) as connection, connection.begin():
            yield connection

    @contextmanager
    def session(self) -> Iterator[sa.Connection]:
        """A connection of one's own, for a lock that lives as long as it does."""
        with self._connection(writes=False) as connection:
            yield connection

    def ask(self, sql: str, /, **values: Any) -> list[tuple[Any, ...]]:
        """Run one SELECT on what is committed; ``:name`` places are filled from ``values``."""
        with self._connection(writes=False) as connection:
            return asking(connection)(sql, **values)

    @contextmanager
    def _connection(self, *, writes: bool) -> Iterator[sa.Connection]:
        try:
            with self._engine.connect() as connection:
                yield connection.execution_options(writes=writes)
        except IntegrityError:  # a row that the schema refuses: the caller knows what it means
            raise
        except DBAPIError as error:
            cause = str(error.orig)
            if isinstance(error, OperationalError) and ("locked" in cause or "busy" in cause):
                raise Busy(
                    f"{self.where}: another process kept it locked for {WAIT_MS // 1000} s. Try again."
                ) from None
            raise StoreError(
                f"{self.where}: {cause.strip()}. Check that the workspace can be read and written."
            ) from None

    def _migrate(self, migrations: Sequence[Migration]) -> None:
        with self.writing() as connection:
            if not self.is_sqlite:
                connection.execute(sa.select(sa.func.pg_advisory_xact_lock(MIGRATION_LOCK)))
            connection.exec_driver_sql(
                "CREATE TABLE IF NOT EXISTS migration "
                "(number INTEGER PRIMARY KEY, name TEXT NOT NULL, applied TEXT NOT NULL)"
            )
            done = queries.schema_number(asking(connection))
            refuse_newer(self.where, done, known=len(migrations))
            for step in migrations[done:]:
                for statement in step.statements:
                    connection.exec_driver_sql(statement)
                connection.execute(sa.insert(MIGRATION).values(number=step.number, name=step.name, applied=utc_now()))


def connect_only(url: str) -> tuple[queries.Ask, Callable[[], None]]:
    """Ask a catalog by url without bringing its schema up to date; and the call that ends it."""
    try:
        engine = sa.create_engine(url)
    except (ArgumentError, ImportError) as error:
        raise StoreError(f"the catalog's address cannot be used: {error}") from None
    where = engine.url.render_as_string(hide_password=True)

    def ask(sql: str, /, **values: Any) -> list[tuple[Any, ...]]:
        try:
            with engine.connect() as connection:
                return asking(connection)(sql, **values)
        except DBAPIError as error:
            raise StoreError(f"{where}: cannot be read: {str(error.orig).strip()}") from None

    try:
        known = sa.inspect(engine).has_table("migration")
    except DBAPIError as error:
        raise StoreError(f"{where}: cannot be read: {str(error.orig).strip()}") from None
    if not known:
        engine.dispose()
        raise NotInStore(f"{where}: holds no catalog of swaygauge. Run a night first, or check the settings.")
    return ask, engine.dispose


def asking(connection: sa.Connection) -> queries.Ask:
    """Ask inside a transaction that is already open."""

    def ask(sql: str, /, **values: Any) -> list[tuple[Any, ...]]:
        return [tuple(row) for row in connection.execute(sa.text(sql), values)]

    return ask


def insert_rows(connection: sa.Connection, table: str, rows: Sequence[Any]) -> None:
    """Insert rows of the table's own type."""
    if rows:
        connection.execute(sa.insert(ROW_TABLES[table]), [to_database(row) for row in rows])


def delete_rows(connection: sa.Connection, table: str, **where: Any) -> None:
    """Delete the rows whose columns have exactly these database values; at least one column."""
    target = ROW_TABLES[table]
    if not where:
        raise ValueError(f"refusing to delete all of {table}")
    connection.execute(sa.delete(target).where(*(target.c[column] == value for column, value in where.items())))


def hold_network_row(connection: sa.Connection, network: str) -> None:
    """Keep others from adding to the network's journals until this transaction ends. Raises NotInStore.

    SQLite's write lock does so by itself; PostgreSQL holds the row.
    """
    row = sa.select(NETWORK.c.name).where(NETWORK.c.name == network).with_for_update()
    if connection.execute(row).first() is None:
        raise NotInStore(f"{network}: no such network in the catalog. Run one of its nights first.")


def _set_up_sqlite(connection: Any, _record: Any) -> None:
    connection.isolation_level = None  # this module says BEGIN itself
    for pragma in PRAGMAS:
        connection.execute(f"PRAGMA {pragma}").close()


def _begin_sqlite(connection: sa.Connection) -> None:
    connection.exec_driver_sql("BEGIN IMMEDIATE" if connection.get_execution_options().get("writes") else "BEGIN")
