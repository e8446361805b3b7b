from __future__ import annotations

import dataclasses
import sqlite3
import subprocess
import sys
import threading
from datetime import date

import numpy as np
import pytest
from example_nights import FIRST, NET, first_nights, run_night, scores_of, stage_night

from swaygauge import records
from swaygauge.errors import Damaged, NotInStore, StoreError
from swaygauge.store import Reader, Store, queries, series
from swaygauge.store.rows import AliasRow, CheckRow, NightRow

NIGHTS = first_nights(4)


@pytest.fixture
def filled(store):
    """Nights 0, 1 and 3 published; night 2 is missing. Site 3 has taken a new name since."""
    for night in (NIGHTS[0], NIGHTS[1], NIGHTS[3]):
        row = run_night(store, night)
    store.publish(NightRow(NET, NIGHTS[2], state="missing", reason="no file"))
    stage_night(store, NIGHTS[3])
    store.publish(
        row,
        aliases=[
            AliasRow(NET, "harbour-news.example", 3, NIGHTS[3], True),
            AliasRow(NET, "hn.example", 3, NIGHTS[0], False),
        ],
    )
    return store


@pytest.fixture
def reader(filled):
    with Reader.open(filled.workspace) as opened:
        yield opened


def test_the_codes_are_those_of_the_records():
    assert (series.MOVED, series.ARRIVED, series.DEPARTED) == (records.MOVED, records.ARRIVED, records.DEPARTED)


def test_nights_facts_checks_and_alerts(reader, filled):
    assert reader.networks() == (NET,)
    assert reader.nights(NET) == filled.nights(NET)
    assert reader.latest(NET).night == NIGHTS[3]
    assert reader.latest(NET, state="missing").night == NIGHTS[2]
    assert reader.latest("nowhere") is None
    view = reader.night(NET, NIGHTS[1])
    assert view.row == filled.night_row(NET, NIGHTS[1])
    assert view.facts["leaks"] == {"zeroed": 3, "share": 0.1}
    assert view.checks == (CheckRow(NET, NIGHTS[1], 0, "kept", "kept", 0.97, "at least 0.95", "repair", True, ""),)
    (alert,) = view.alerts
    assert (alert.kind, alert.node, alert.node_name, alert.facts["new_links"]) == ("surge", 7, "site-7.example", 12)
    assert alert.sentence == "site-7.example rose from place 40 to 10."
    assert reader.facts(NET, name="leaks", nights=NIGHTS).keys() == {NIGHTS[0], NIGHTS[1], NIGHTS[3]}
    with pytest.raises(NotInStore, match=r"2031-04-01 is not in the store. It has 2031-03-01 to 2031-03-04"):
        reader.night(NET, date(2031, 4, 1))
    with pytest.raises(NotInStore, match="has no night yet"):
        reader.night("nowhere", FIRST)


def test_alerts_of_a_range_a_kind_a_node(reader):
    assert [a.night for a in reader.alerts(NET, first=NIGHTS[0], last=NIGHTS[3])] == [NIGHTS[0], NIGHTS[1]]
    assert len(reader.alerts(NET, first=NIGHTS[1])) == 1
    assert reader.alerts(NET, first=NIGHTS[0], last=NIGHTS[3], kind="swing") == ()
    assert len(reader.alerts(NET, first=NIGHTS[0], last=NIGHTS[3], kind="surge", node=7)) == 2
    assert reader.alerts(NET, first=NIGHTS[0], last=NIGHTS[3], node=8) == ()


def test_standing_is_the_ranking(reader):
    scores = scores_of(NIGHTS[1], nodes=50)
    order = np.argsort(scores.rank)
    top = reader.standing(NET, NIGHTS[1], score="katz", count=5)
    assert [(row.rank, row.node, row.value, row.bound) for row in top] == [
        (at + 1, int(node), scores.value[node], 1e-10) for at, node in enumerate(order[:5])
    ]
    assert [row.name for row in reader.standing(NET, NIGHTS[1], score="katz", count=50) if row.node != 3] == [
        f"site-{node}.example" for node in order if node != 3
    ]
    assert [row.rank for row in reader.standing(NET, NIGHTS[1], score="katz", first=49, count=20)] == [49, 50]
    assert reader.standing(NET, NIGHTS[1], score="katz", first=51) == ()


def test_standing_shows_where_a_node_stood_before(reader):
    rows = {row.node: row for row in reader.standing(NET, NIGHTS[1], score="katz", count=50)}
    assert (rows[0].rank_before, rows[1].rank_before) == (rows[1].rank, rows[0].rank)  # the two that swapped
    assert rows[0].octaves == np.log2(rows[1].rank / rows[0].rank)
    assert rows[5].rank_before == rows[5].rank
    assert rows[49].rank_before is None  # arrived
    assert all(
        row.rank_before is None for row in reader.standing(NET, NIGHTS[0], score="katz")
    )  # nothing to compare with


def test_standing_finds_names_and_other_names(reader):
    found = reader.standing(NET, NIGHTS[3], score="katz", search="SITE-4", count=50)
    assert {row.name for row in found} == {f"site-{node}.example" for node in (4, *range(40, 50))}
    assert [row.rank for row in found] == sorted(row.rank for row in found)
    assert [row.node for row in reader.standing(NET, NIGHTS[3], score="katz", search="Harbour")] == [3]
    assert reader.standing(NET, NIGHTS[3], score="katz", search="%") == ()
    assert reader.standing(NET, NIGHTS[3], score="katz", search="' OR 1=1 --") == ()


def test_a_night_without_the_score_says_so(reader):
    with pytest.raises(NotInStore, match=r"2031-03-03 \(missing\): there is no score 'katz'"):
        reader.standing(NET, NIGHTS[2], score="katz")
    with pytest.raises(NotInStore, match="there is katz"):
        reader.standing(NET, NIGHTS[1], score="nope")
    with pytest.raises(NotInStore, match="not compared with another night"):
        reader.moves(NET, NIGHTS[0], score="katz")


def test_moves_by_direction(reader):
    rank = scores_of(NIGHTS[1], nodes=50).rank
    up, down = (0, 1) if rank[0] < rank[1] else (1, 0)
    rose = reader.moves(NET, NIGHTS[1], score="katz", direction="rose")
    assert [(row.node, row.direction, row.rank_before, row.rank_now) for row in rose] == [
        (up, "rose", rank[down], rank[up])
    ]
    (fell,) = reader.moves(NET, NIGHTS[1], score="katz", direction="fell")
    assert (fell.node, fell.octaves) == (down, pytest.approx(-rose[0].octaves))
    assert {row.node for row in reader.moves(NET, NIGHTS[1], score="katz")} == {0, 1}
    (came,) = reader.moves(NET, NIGHTS[1], score="katz", direction="came")
    assert (came.node, came.rank_before, came.rank_now, came.octaves) == (49, None, rank[49], None)
    (left,) = reader.moves(NET, NIGHTS[1], score="katz", direction="left")
    assert (left.node, left.rank_now, left.value_now) == (48, None, None)
    best = int(min(rank[0], rank[1]))
    assert len(reader.moves(NET, NIGHTS[1], score="katz", within=best)) == 2
    assert reader.moves(NET, NIGHTS[1], score="katz", within=best - 1) == ()
    with pytest.raises(StoreError, match="direction: expected one of"):
        reader.moves(NET, NIGHTS[1], score="katz", direction="up")


def test_finding_a_node(reader):
    def found(text):
        return [(match.node, match.name, match.how) for match in reader.find_node(NET, text)]

    assert found("site-7.example") == [(7, "site-7.example", "name")]
    assert found("site-3.example") == [(3, "harbour-news.example", "name")]
    assert found("hn.example") == [(3, "harbour-news.example", "alias")]
    assert found("SITE-12") == [(12, "site-12.example", "close")]
    assert len(found("site-4")) == 10  # of eleven: count bounds it
    assert (8, "site-8.example", "close") in found("site8.exampel")
    assert found("zzzzzzzz") == []
    assert found("'; DROP TABLE alias; --") == []
    assert found("\udcff") == []
    assert reader.names(NET, [3, 4]) == {3: "harbour-news.example", 4: "site-4.example"}
    with pytest.raises(Damaged, match=r"no name for ids \[99\]"):
        reader.names(NET, [99])


def test_a_trace_shows_every_night_and_its_gaps(reader):
    points = reader.trace(NET, 5, score="katz")
    assert [(point.night, point.state) for point in points] == [
        (NIGHTS[0], "published"),
        (NIGHTS[1], "published"),
        (NIGHTS[2], "missing"),
        (NIGHTS[3], "published"),
    ]
    for at in (0, 1, 3):
        scores = scores_of(NIGHTS[at], nodes=50)
        assert (points[at].rank, points[at].value) == (scores.rank[5], scores.value[5])
        assert (points[at].best, points[at].worst, points[at].bound) == (scores.best[5], scores.worst[5], 1e-10)
    assert points[2].rank is points[2].value is None
    assert reader.trace(NET, 5, score="katz", nights=2) == points[2:]
    assert all(point.rank is None for point in reader.trace(NET, 4_000, score="katz"))
    assert reader.trace("nowhere", 5, score="katz") == ()


def test_reading_goes_on_while_a_writer_is_open(reader, filled):
    before = reader.nights(NET)
    with filled.catalog.writing() as connection:
        connection.exec_driver_sql("UPDATE night SET degraded = 1")
        assert reader.nights(NET) == before
        assert len(reader.trace(NET, 5, score="katz")) == 4
    assert all(row.degraded for row in reader.nights(NET))


def test_a_reader_cannot_write(reader):
    with pytest.raises(StoreError, match="readonly"):
        reader._ask("DELETE FROM night")


def test_a_night_is_never_seen_half(filled):
    """One thread publishes two kinds of the same night in turn, another reads: facts and row always belong together."""
    stop = threading.Event()
    row = filled.night_row(NET, NIGHTS[0])

    def publish():
        with Store.open(filled.workspace) as writer:
            at = row
            for turn in range(40):
                writer.stage_fact(NET, NIGHTS[0], name="turn", value=turn)
                at = writer.publish(dataclasses.replace(at, reason=str(turn)))
        stop.set()

    thread = threading.Thread(target=publish)
    thread.start()
    seen = set()
    with Reader.open(filled.workspace) as reader:
        while not stop.is_set():
            view = reader.night(NET, NIGHTS[0])
            if view.row.reason:
                assert view.facts == {"turn": int(view.row.reason)}
                seen.add(view.row.reason)
    thread.join()
    assert seen


def test_a_file_replaced_under_the_reader_is_looked_up_again(reader, filled, monkeypatch):
    """The catalog is read, then the night is published anew and swept: the reader must not fail."""
    stale = queries.parts(filled.catalog.ask, NET, NIGHTS[1])
    run_night(filled, NIGHTS[1], seed=8)
    for part in stale:
        if "scores" in part.path:
            (filled.workspace / part.path).unlink()
    answers = iter([stale])
    real = queries.parts
    monkeypatch.setattr(queries, "parts", lambda *a, **o: next(answers, None) or real(*a, **o))
    rank = scores_of(NIGHTS[1], nodes=50, seed=8).rank
    assert reader.standing(NET, NIGHTS[1], score="katz", count=1)[0].node == int(np.argmin(rank))


def test_a_damaged_file_is_told(reader, filled):
    part = queries.part(filled.catalog.ask, NET, NIGHTS[1], "scores", "katz")
    (filled.workspace / part.path).write_bytes(b"PAR1 nothing of the kind PAR1")
    with pytest.raises(Damaged, match="Run `checkup`"):
        reader.standing(NET, NIGHTS[1], score="katz")


@pytest.mark.parametrize("folder", ["it's", "a*b", "what?", "night=2020-01-01", "[x]", "sp ace", "%20#?&", "caf\u00e9"])
def test_a_workspace_may_be_called_anything(tmp_path, folder):
    with Store.open(tmp_path / folder) as store:
        run_night(store, NIGHTS[0])
        run_night(store, NIGHTS[1])
    (tmp_path / folder.replace("*", "x").replace("?", "x")).mkdir(exist_ok=True)  # what a wildcard would match too
    with Reader.open(tmp_path / folder) as reader:
        assert [point.rank for point in reader.trace(NET, 5, score="katz")].count(None) == 0
        assert reader.standing(NET, NIGHTS[1], score="katz", count=1)[0].rank == 1
        assert reader.find_node(NET, "site-7.example")[0].node == 7


def test_a_workspace_on_a_read_only_disk_can_be_read(filled, monkeypatch):
    """Where SQLite can make no helper file, an untouched catalog is still read (root may write anywhere: simulated)."""
    filled.close()
    real = sqlite3.connect

    def connect(address, **options):
        if "immutable" not in address:
            return Unable()
        return real(address, **options)

    class Unable:
        def execute(self, _):
            raise sqlite3.OperationalError("unable to open database file")

        def close(self):
            pass

    monkeypatch.setattr(sqlite3, "connect", connect)
    with Reader.open(filled.workspace) as reader:
        assert len(reader.nights(NET)) == 4
    (filled.workspace / "catalog.sqlite-wal").touch()
    with pytest.raises(StoreError, match="Check that its folder can be read and written"):
        Reader.open(filled.workspace)


GUARD = """
import sys
import swaygauge.store
from swaygauge.store import Reader
from datetime import date
from pathlib import Path
if len(sys.argv) > 1:
    with Reader.open(Path(sys.argv[1])) as reader:
        night = reader.latest("ostrel").night
        reader.night("ostrel", night)
        reader.standing("ostrel", night, score="katz", search="site")
        reader.find_node("ostrel", "site-7.example")
        reader.trace("ostrel", 7, score="katz")
heavy = {"sqlalchemy", "numpy", "pandas", "pyarrow", "prefect", "great_expectations", "scipy"} & set(sys.modules)
sys.exit(f"loaded: {sorted(heavy)}" if heavy else 0)
"""


def test_reading_loads_nothing_heavy(filled):
    for arguments in ([], [str(filled.workspace)]):
        done = subprocess.run([sys.executable, "-c", GUARD, *arguments], capture_output=True, text=True, check=False)
        assert (done.returncode, done.stderr) == (0, "")
