"""The catalog read-only, for commands that must answer at once: stdlib sqlite3, or SQLAlchemy for PostgreSQL."""

from __future__ import annotations

import sqlite3
from collections.abc import Callable
from pathlib import Path
from typing import Any, Final
from urllib.parse import quote

from swaygauge.errors import NotInStore, StoreError
from swaygauge.store import queries
from swaygauge.store.layout import CATALOG
from swaygauge.store.migrations import MIGRATIONS, refuse_newer

WAIT_S: Final = 5.0


def open_read_only(workspace: Path, url: str | None) -> tuple[queries.Ask, Callable[[], None]]:
    """A way to ask, and the call that ends it. Raises NotInStore when there is no catalog, StoreError when not ours."""
    ask, close = _open_url(url) if url else _open_file(workspace / CATALOG)
    where = "the shared catalog" if url else str(workspace / CATALOG)
    try:
        _check_schema(ask, where)
    except BaseException:
        close()
        raise
    return ask, close


def _open_file(file: Path) -> tuple[queries.Ask, Callable[[], None]]:
    if not file.is_file():
        raise NotInStore(f"{file}: there is no catalog yet. Run a night first, or check the workspace in the settings.")
    connection = _connect(file)
    if not connection.execute("SELECT count(*) FROM sqlite_master WHERE name = 'migration'").fetchone()[0]:
        connection.close()
        raise NotInStore(f"{file}: holds no catalog of swaygauge. Run a night first, or check the settings.")

    def ask(sql: str, /, **values: Any) -> list[tuple[Any, ...]]:
        try:
            return connection.execute(sql, values).fetchall()
        except sqlite3.Error as error:
            raise StoreError(f"{file}: cannot be read: {error}") from None

    return ask, connection.close


def _connect(file: Path) -> sqlite3.Connection:
    """WAL needs a helper file beside the database; where none can be made and none is there, nobody writes either."""
    address = f"file:{quote(str(file))}?mode=ro"
    connection = sqlite3.connect(address, uri=True, timeout=WAIT_S, isolation_level=None)
    try:
        connection.execute("SELECT count(*) FROM sqlite_master").fetchone()
    except sqlite3.OperationalError as error:
        connection.close()
        if file.with_name(file.name + "-wal").exists():
            raise StoreError(
                f"{file}: cannot be read: {error}. Check that its folder can be read and written."
            ) from None
        connection = sqlite3.connect(f"{address}&immutable=1", uri=True, isolation_level=None)
    except sqlite3.DatabaseError as error:
        connection.close()
        raise StoreError(f"{file}: not a catalog: {error}. Restore it from a backup.") from None
    return connection


def _open_url(url: str) -> tuple[queries.Ask, Callable[[], None]]:
    from swaygauge.store.catalog import connect_only

    return connect_only(url)


def _check_schema(ask: queries.Ask, where: str) -> None:
    number = queries.schema_number(ask)
    refuse_newer(where, number, known=len(MIGRATIONS))
    if number < len(MIGRATIONS):
        raise StoreError(
            f"{where}: has schema {number}, this version reads {len(MIGRATIONS)}. Run a night or `checkup` once: it "
            "brings the catalog up to date."
        )
