from __future__ import annotations

import dataclasses
from datetime import date

import pytest
from example_nights import FIRST, NET, first_nights, run_night, stage_night

from swaygauge.store import queries
from swaygauge.store.checkup import checkup
from swaygauge.store.rows import NightRow

NIGHTS = first_nights(3)


@pytest.fixture
def filled(store):
    for night in NIGHTS:
        run_night(store, night)
    return store


def change(store, sql: str) -> None:
    with store.catalog.writing() as connection:
        connection.exec_driver_sql(sql)


def test_a_sound_workspace_has_no_finding(filled):
    seen = []
    assert checkup(filled, NET, progress=seen.append) == []
    assert seen == ["catalog", "names", "parts", "chain", "leftovers"]
    assert checkup(filled, "nowhere") == []


def test_a_changed_byte_is_found_and_named(filled):
    part = queries.part(filled.catalog.ask, NET, NIGHTS[1], "moves", "katz")
    path = filled.workspace / part.path
    data = bytearray(path.read_bytes())
    data[len(data) // 2] ^= 1
    path.write_bytes(data)
    (finding,) = checkup(filled, NET)
    assert (finding.level, finding.night) == ("damaged", NIGHTS[1])
    assert "night 2031-03-02, moves katz" in finding.what
    assert str(path) in finding.what
    assert finding.todo == "Run night 2031-03-02 of ostrel again, or restore the file from a backup."
    path.unlink()
    assert "is missing" in checkup(filled, NET)[0].what


@pytest.mark.parametrize(
    "sql",
    [
        "UPDATE fact SET value = '{\"share\":0.2,\"zeroed\":3}' WHERE night = '2031-03-02' AND name = 'leaks'",
        "UPDATE alert SET rank_now = 11 WHERE night = '2031-03-02'",
        "DELETE FROM alert WHERE night = '2031-03-02'",
        "UPDATE check_result SET ok = 0 WHERE night = '2031-03-02'",
        "UPDATE night SET alpha = 0.26 WHERE night = '2031-03-02'",
        "DELETE FROM part WHERE night = '2031-03-02' AND kind = 'raw'",
    ],
)
def test_a_changed_row_breaks_the_digest(filled, sql):
    change(filled, sql)
    damaged = [finding for finding in checkup(filled, NET) if finding.level == "damaged"]
    assert [finding.night for finding in damaged] == [NIGHTS[1]]
    assert "do not give the digest" in damaged[0].what


def test_row_counts_are_compared(filled):
    change(filled, "UPDATE part SET rows = 49 WHERE night = '2031-03-02' AND kind = 'raw'")
    whats = [finding.what for finding in checkup(filled, NET)]
    assert any("50 rows, the catalog says 49" in what for what in whats)


def test_nights_that_rest_on_an_older_version_are_stale(filled):
    run_night(filled, NIGHTS[0], seed=4)
    (finding,) = [finding for finding in checkup(filled, NET) if finding.level != "note"]
    assert (finding.level, finding.night) == ("stale", NIGHTS[1])
    assert "earlier version of night 2031-03-01" in finding.what
    run_night(filled, NIGHTS[1])
    assert [f.night for f in checkup(filled, NET) if f.level == "stale"] == [NIGHTS[2]]
    run_night(filled, NIGHTS[2])
    assert [f.level for f in checkup(filled, NET)] == ["note"]


def test_a_night_that_rests_on_nothing_is_damage(filled):
    filled.publish(NightRow(NET, date(2031, 5, 1), state="held", previous=date(2031, 4, 30), basis="00"))
    (finding,) = checkup(filled, NET)
    assert "rests on night 2031-04-30, which is not in the store" in finding.what


def test_the_name_table_must_be_dense_and_without_repetition(filled):
    filled.names(NET).intern(["a", "b"], night=FIRST)
    change(filled, "UPDATE name_part SET first = 51 WHERE first = 50")
    assert [f.what for f in checkup(filled, NET) if f.level == "damaged"] == [
        "ostrel: the name table has ids up to 49, then goes on with 51.",
        next(f.what for f in checkup(filled, NET) if "does not hold ids 51 to 52" in f.what),
    ]
    change(filled, "DELETE FROM name_part WHERE first = 0")
    assert any("goes on with 51" in f.what for f in checkup(filled, NET))


def test_a_damaged_name_table_says_that_only_a_backup_helps(filled):
    path = filled.workspace / queries.name_parts(filled.catalog.ask, NET)[0].path
    path.write_bytes(b"x" + path.read_bytes()[1:])
    (finding,) = checkup(filled, NET)
    assert (finding.level, finding.night) == ("damaged", None)
    assert "Restore the name table from a backup" in finding.todo


def test_a_name_with_two_ids_is_found(filled):
    table = filled.names(NET)
    table.intern(["other"], night=FIRST)
    parts = queries.name_parts(filled.catalog.ask, NET)
    # the same names once more behind, as a broken writer would leave them
    with filled.catalog.writing() as connection:
        import pyarrow as pa

        table._append(connection, parts, pa.array(["other", "site-3.example"], pa.large_string()), FIRST)
    (finding,) = checkup(filled, NET)
    assert "2 names have more than one id" in finding.what


def test_leftovers_are_listed(filled):
    stage_night(filled, NIGHTS[2], seed=6)
    stray = filled.workspace / NET / "raw" / "stray.parquet"
    stray.write_bytes(b"12345")
    notes = checkup(filled, NET)
    assert [(finding.level, finding.night) for finding in notes] == [("note", NIGHTS[2]), ("note", None)]
    assert "begun and not published" in notes[0].what
    assert "1 files that no row names (5 bytes), ostrel/raw/stray.parquet among them" in notes[1].what
    assert all(dataclasses.asdict(finding)["todo"] for finding in notes)


def test_a_damaged_catalog_is_found(filled):
    filled.catalog.ask("PRAGMA wal_checkpoint(TRUNCATE)")
    filled.close()
    path = filled.workspace / "catalog.sqlite"
    data = bytearray(path.read_bytes())
    page = data.index(b"alert_by_node")  # the schema page stays; an index page of it is overwritten
    assert page
    size = int.from_bytes(data[16:18], "big")
    root = filled.catalog.ask("SELECT rootpage FROM sqlite_master WHERE name = 'alert_by_node'")[0][0]
    filled.close()
    data[(root - 1) * size + 8 : (root - 1) * size + 200] = bytes(192)
    path.write_bytes(data)
    assert any("the catalog of ostrel" in finding.what for finding in checkup(filled, NET))
