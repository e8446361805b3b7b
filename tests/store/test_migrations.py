from __future__ import annotations

import dataclasses
import sqlite3
import subprocess
import sys
from datetime import date

import pytest
import sqlalchemy as sa

from swaygauge.errors import NotInStore, StoreError
from swaygauge.store import Reader, Store, rows
from swaygauge.store.catalog import Catalog
from swaygauge.store.migrations import MIGRATIONS, Migration
from swaygauge.store.schema import ROW_TABLES

LATER = Migration(len(MIGRATIONS) + 1, "a note per network", ("ALTER TABLE network ADD COLUMN note TEXT",))


def applied(path) -> list[int]:
    with sqlite3.connect(path) as connection:
        found = [number for (number,) in connection.execute("SELECT number FROM migration ORDER BY number")]
    connection.close()
    return found


def test_numbers_count_from_one_without_gaps():
    assert [step.number for step in MIGRATIONS] == list(range(1, len(MIGRATIONS) + 1))


def test_an_empty_workspace_gets_every_step_once(tmp_path):
    for _ in range(2):
        Catalog(tmp_path).close()
    assert applied(tmp_path / "catalog.sqlite") == [step.number for step in MIGRATIONS]


def test_an_older_schema_is_brought_up_to_date_with_its_rows(tmp_path):
    with Store.open(tmp_path) as store:
        store.names("net").intern(["a"], night=date(2031, 3, 1))
    newer = Catalog(tmp_path, migrations=(*MIGRATIONS, LATER))
    assert newer.ask("SELECT name, note FROM network") == [("net", None)]
    newer.close()
    assert applied(tmp_path / "catalog.sqlite")[-1] == LATER.number


def test_a_step_that_fails_leaves_the_schema_as_it_was(tmp_path):
    Catalog(tmp_path).close()
    broken = Migration(len(MIGRATIONS) + 1, "x", (*LATER.statements, "ALTER TABLE nowhere ADD COLUMN x TEXT"))
    with pytest.raises(StoreError, match="no such table: nowhere"):
        Catalog(tmp_path, migrations=(*MIGRATIONS, broken))
    assert applied(tmp_path / "catalog.sqlite") == [step.number for step in MIGRATIONS]
    catalog = Catalog(tmp_path)
    assert list(catalog.ask("SELECT name FROM pragma_table_info('network')")) == [
        ("name",),
        ("created",),
    ]
    catalog.close()


def test_a_newer_schema_is_refused_and_left_alone(tmp_path):
    Catalog(tmp_path, migrations=(*MIGRATIONS, LATER)).close()
    for open_it in (Store.open, Reader.open):
        with pytest.raises(StoreError, match=f"made by a newer swaygauge .schema {LATER.number}"):
            open_it(tmp_path)
    assert applied(tmp_path / "catalog.sqlite")[-1] == LATER.number


def test_reading_an_older_schema_says_how_to_bring_it_up_to_date(tmp_path):
    catalog = Catalog(tmp_path)
    with catalog.writing() as connection:
        connection.execute(sa.text("DELETE FROM migration"))
    catalog.close()
    with pytest.raises(StoreError, match="Run a night or `checkup` once"):
        Reader.open(tmp_path)


def test_tables_have_the_columns_of_their_rows(tmp_path):
    catalog = Catalog(tmp_path)
    row_types = {
        "night": rows.NightRow,
        "part": rows.PartRow,
        "staged_part": rows.PartRow,
        "fact": rows.FactRow,
        "staged_fact": rows.FactRow,
        "check_result": rows.CheckRow,
        "alert": rows.AlertRow,
        "run": rows.RunRow,
        "acceptance": rows.AcceptanceRow,
        "name_part": rows.NamePartRow,
        "alias": rows.AliasRow,
    }
    assert set(ROW_TABLES) == set(row_types)
    for table, row in row_types.items():
        have = {name for (name,) in catalog.ask("SELECT name FROM pragma_table_info(:table)", table=table)}
        assert have == {item.name for item in dataclasses.fields(row)}
    catalog.close()


def test_the_catalog_is_in_wal_mode_and_commits_reach_the_disk(tmp_path):
    catalog = Catalog(tmp_path)
    assert catalog.ask("PRAGMA journal_mode") == [("wal",)]
    assert catalog.ask("PRAGMA synchronous") == [(2,)]
    assert catalog.ask("PRAGMA foreign_keys") == [(1,)]
    catalog.close()


OPEN = "import sys; from pathlib import Path; from swaygauge.store import Store; Store.open(Path(sys.argv[1])).close()"


def test_two_processes_may_create_one_workspace(tmp_path):
    work = tmp_path / "new" / "deeper"
    both = [subprocess.Popen([sys.executable, "-c", OPEN, str(work)]) for _ in range(2)]
    assert [process.wait(timeout=60) for process in both] == [0, 0]
    assert applied(work / "catalog.sqlite") == [step.number for step in MIGRATIONS]


def test_what_is_no_catalog_is_told(tmp_path):
    with pytest.raises(NotInStore, match="no catalog yet"):
        Reader.open(tmp_path)
    (tmp_path / "catalog.sqlite").write_bytes(b"something else entirely" * 100)
    with pytest.raises(StoreError, match="not a catalog"):
        Reader.open(tmp_path)
    with pytest.raises(StoreError, match="not a database"):
        Store.open(tmp_path)
    (tmp_path / "catalog.sqlite").unlink()
    sqlite3.connect(tmp_path / "catalog.sqlite").close()
    with pytest.raises(NotInStore, match="holds no catalog of swaygauge"):
        Reader.open(tmp_path)
    for url in ("nonsense", "martian://x/y"):
        for open_it in (Store.open, Reader.open):
            with pytest.raises(StoreError, match="address cannot be used"):
                open_it(tmp_path, url=url)
