from __future__ import annotations

import dataclasses
import json
import os
import subprocess
import sys
from datetime import UTC, date, datetime, timedelta, timezone
from pathlib import Path

import numpy as np
import pytest
from example_nights import FIRST, NET, RULE, alert_of, first_nights, run_night, stage_night

from swaygauge.errors import Busy, Damaged, NotInStore, StoreError
from swaygauge.records import RunReport, ScoreSet, StageReport
from swaygauge.store import Reader, Store, catalog, queries
from swaygauge.store import files as files_module
from swaygauge.store.publishing import orphans, sweep
from swaygauge.store.rows import AliasRow, NightRow, canonical_json


def files(store: Store) -> dict[str, bytes]:
    """Every live part's bytes."""
    return {p.path: (store.workspace / p.path).read_bytes() for p in queries.all_parts(store.catalog.ask, NET)}


def test_a_night_is_invisible_until_it_is_published(store):
    row = stage_night(store, FIRST)
    assert store.nights(NET) == ()
    assert not store.has_part(NET, FIRST, kind="raw")
    with pytest.raises(NotInStore, match="2031-03-01, raw: not in the store"):
        store.part(NET, FIRST, kind="raw")
    with pytest.raises(NotInStore):
        store.fact(NET, FIRST, name="leaks")
    assert store.fact(NET, FIRST, name="leaks", staged=True) == {"zeroed": 3, "share": 0.1}
    published = store.publish(row)
    assert store.night_row(NET, FIRST) == published == dataclasses.replace(row, digest=published.digest, version=1)
    assert store.part(NET, FIRST, kind="raw")["source"].tolist() == list(range(50))
    assert store.fact(NET, FIRST, name="leaks") == {"zeroed": 3, "share": 0.1}
    assert not store.has_part(NET, FIRST, kind="raw", staged=True)
    assert queries.staged_nights(store.catalog.ask, NET) == ()


def test_arrays_are_read_only_and_exact(store):
    run_night(store, FIRST)
    scores = store.record(ScoreSet, NET, FIRST, kind="scores", score="katz")
    with pytest.raises(ValueError, match="read-only"):
        scores.value[0] = 1.0
    assert scores.night == FIRST
    assert scores.ids.dtype == np.int32


def test_publishing_again_replaces_everything_the_night_had(store):
    run_night(store, FIRST)
    row = store.night_row(NET, FIRST)
    store.stage_part(NET, FIRST, kind="other", columns={"x": np.zeros(3)})
    held = store.publish(dataclasses.replace(row, state="held", accepted=False, reason="too few links"))
    assert (held.version, held.state) == (2, "held")
    assert [p.kind for p in queries.parts(store.catalog.ask, NET, FIRST)] == ["other"]
    assert queries.facts(store.catalog.ask, NET, FIRST) == {}
    assert queries.alerts(store.catalog.ask, NET, first=FIRST, last=FIRST) == ()
    assert queries.checks(store.catalog.ask, NET, FIRST) == ()
    assert store.last_accepted(NET, before=date(2032, 1, 1)) is None


def test_same_input_same_bytes_and_digest_in_another_workspace(tmp_path):
    seen = []
    for name in ("one", "two"):
        with Store.open(tmp_path / name) as store:
            rows = [run_night(store, night) for night in first_nights(3)]
            seen.append((rows, files(store)))
    assert seen[0] == seen[1]


def test_a_re_run_gives_the_same_bytes_and_digest_and_writes_no_file(store):
    nights = first_nights(3)
    first = [run_night(store, night) for night in nights]
    before = files(store)
    on_disk = sorted(store.workspace.rglob("*.parquet"))
    again = [run_night(store, night) for night in nights]
    assert [row.digest for row in again] == [row.digest for row in first]
    assert [row.version for row in again] == [2, 2, 2]
    assert files(store) == before
    assert sorted(store.workspace.rglob("*.parquet")) == on_disk


def test_another_input_changes_the_digest_and_those_that_rest_on_it(store):
    nights = first_nights(3)
    first = [run_night(store, night).digest for night in nights]
    changed = [run_night(store, night, seed=1).digest for night in nights[:1]]
    changed += [run_night(store, night).digest for night in nights[1:]]
    assert all(one != two for one, two in zip(first, changed, strict=True))


def test_the_digest_does_not_know_when_or_where_the_file_lay(store):
    row = run_night(store, FIRST)
    stage_night(store, FIRST)
    moved = dataclasses.replace(row, input_mtime_ns=5, input_file="elsewhere.csv")
    published = store.publish(moved, checks=[RULE], alerts=[alert_of(FIRST)], node_names={7: "another wording"})
    assert published.digest == row.digest
    stage_night(store, FIRST)
    judged = dataclasses.replace(published, degraded=True)
    assert store.publish(judged, checks=[RULE], alerts=[alert_of(FIRST)]).digest != row.digest
    stage_night(store, FIRST)
    assert store.publish(dataclasses.replace(published, version=3), checks=[RULE]).digest != row.digest


def test_an_outdated_row_is_refused_and_nothing_changes(store):
    row = stage_night(store, FIRST)
    store.publish(row)
    stage_night(store, FIRST, seed=5)
    before = files(store)
    with pytest.raises(Busy, match=r"version 1, this run began with 0"):
        store.publish(row)
    assert files(store) == before
    assert store.has_part(NET, FIRST, kind="raw", staged=True)
    with pytest.raises(Busy, match="version 0, this run began with 4"):
        store.publish(NightRow(NET, date(2031, 5, 1), state="missing", version=4))


def test_two_alerts_with_one_key_are_refused(store):
    row = stage_night(store, FIRST)
    with pytest.raises(StoreError, match=r"twice: \['surge-7-2031-03-01'\]"):
        store.publish(row, alerts=[alert_of(FIRST), alert_of(FIRST)])
    assert store.nights(NET) == ()


def test_a_state_that_is_none_is_refused(store):
    with pytest.raises(StoreError, match="the catalog refuses the row"):
        store.publish(NightRow(NET, FIRST, state="publised"))


def test_history_is_the_accepted_nights_in_order(store):
    nights = first_nights(5)
    for night in (nights[3], nights[0], nights[1], nights[4]):
        run_night(store, night)
    row = store.night_row(NET, nights[3])
    stage_night(store, nights[3])
    store.publish(dataclasses.replace(row, state="held", accepted=False))
    store.publish(NightRow(NET, nights[2], state="missing"))
    assert [row.night for row in store.nights(NET)] == nights
    assert [row.night for row in store.accepted_nights(NET, before=nights[4])] == nights[:2]
    assert [row.night for row in store.accepted_nights(NET, before=date.max, last=2)] == [nights[1], nights[4]]
    assert store.last_accepted(NET, before=nights[4]).night == nights[1]
    assert store.last_accepted(NET, before=nights[0]) is None
    leaks = store.facts(NET, name="leaks", nights=[nights[4], nights[0], nights[2]])
    assert leaks == {nights[0]: {"zeroed": 3, "share": 0.1}, nights[4]: {"zeroed": 3, "share": 0.1}}
    assert store.facts(NET, name="leaks", nights=[]) == {}


def test_clearing_forgets_what_was_staged_and_leaves_what_is_published(store):
    run_night(store, FIRST)
    stage_night(store, FIRST, seed=9)
    store.clear_staging(NET, FIRST)
    assert queries.staged_nights(store.catalog.ask, NET) == ()
    assert store.has_part(NET, FIRST, kind="raw")


@pytest.mark.parametrize("value", [float("nan"), float("inf"), {"a": {1, 2}}, object(), np.array([np.nan])])
def test_a_fact_that_is_no_json_is_refused(store, value):
    with pytest.raises(StoreError, match="cannot be stored as JSON"):
        store.stage_fact(NET, FIRST, name="x", value=value)


def test_facts_have_one_form(store):
    value = {"b": np.float64(0.1), "a": np.int32(3), "n": FIRST, "t": ("x", None, True), "u": "\udcff\0\u202e"}
    store.stage_fact(NET, FIRST, name="x", value=value)
    back = store.fact(NET, FIRST, name="x", staged=True)
    assert back == {"b": 0.1, "a": 3, "n": "2031-03-01", "t": ["x", None, True], "u": "\udcff\0\u202e"}
    assert canonical_json(back) == canonical_json(dict(reversed(back.items())))


@pytest.mark.parametrize(
    "network",
    ["", ".", "..", "a/b", "../up", "a b", "-a", "_a", "a\0", "a\n", "x" * 65, "\u00e9", "a'", "prefect", "CON:"],
)
def test_a_network_that_cannot_be_a_folder_is_refused(store, network):
    attempts = [
        lambda: store.names(network),
        lambda: store.stage_fact(network, FIRST, name="x", value=1),
        lambda: store.stage_part(network, FIRST, kind="raw", columns={"x": np.zeros(1)}),
        lambda: store.publish(NightRow(network, FIRST, state="missing")),
        lambda: store.lock(network),
        lambda: store.clear_staging(network, FIRST),
    ]
    for attempt in attempts:
        with pytest.raises(StoreError, match="a network cannot be called"):
            attempt()
    assert store.networks() == ()
    assert [path.name for path in store.workspace.iterdir() if path.is_dir()] == []


@pytest.mark.parametrize(
    ("kind", "score"), [("Raw", ""), ("", ""), ("a/b", ""), ("raw", "../x"), ("raw", "a b"), ("..", "")]
)
def test_a_kind_that_cannot_be_a_folder_is_refused(store, kind, score):
    with pytest.raises(StoreError, match="cannot be called"):
        store.stage_part(NET, FIRST, kind=kind, score=score, columns={"x": np.zeros(1)})


def test_a_damaged_part_is_named_and_a_re_run_heals_it(store):
    run_night(store, FIRST)
    part = queries.part(store.catalog.ask, NET, FIRST, "scores", "katz")
    path = store.workspace / part.path
    good = path.read_bytes()
    for bad in (good[:-9], bytes([good[0] ^ 1]) + good[1:]):
        path.write_bytes(bad)
        with pytest.raises(Damaged, match=r"night 2031-03-01, scores katz: .*Run night 2031-03-01 of ostrel again"):
            store.part(NET, FIRST, kind="scores", score="katz")
        run_night(store, FIRST)
        assert path.read_bytes() == good
    path.unlink()
    with pytest.raises(Damaged, match="is missing"):
        store.part(NET, FIRST, kind="scores", score="katz")


def test_superfluous_files_go_with_a_sweep_once_they_are_old(store):
    run_night(store, FIRST)
    old = set(files(store))
    run_night(store, FIRST, seed=3)
    stray = store.workspace / NET / "raw" / ".half-written.parquet.77"
    stray.write_bytes(b"half")
    replaced = old - set(files(store))
    assert len(replaced) == 1  # the scores; the links are the same
    assert {p.relative_to(store.workspace).as_posix() for p in orphans(store.catalog, store.workspace, NET)} == {
        *replaced,
        stray.relative_to(store.workspace).as_posix(),
    }
    run_night(store, first_nights(2)[1])
    assert store.sweep(NET) == 0, "they are too young"
    assert len(orphans(store.catalog, store.workspace, NET)) == 2
    for path in orphans(store.catalog, store.workspace, NET):
        os.utime(path, (1, 1))
    staged = stage_night(store, first_nights(3)[2])
    for path in store.workspace.rglob("*.parquet"):
        os.utime(path, (1, 1))  # staged and live files stay however old they are
    assert store.sweep(NET) == 2
    store.publish(staged)
    assert orphans(store.catalog, store.workspace, NET) == []
    assert len(files(store)) == 8
    assert all((store.workspace / path).is_file() for path in files(store))
    assert sweep(store.catalog, store.workspace, NET, age_s=0) == 0


def test_acceptances_are_only_ever_added(store):
    store.publish(NightRow(NET, FIRST, state="held", reason="it's low"))
    first = store.accept(NET, FIRST, reason="looked at; \0 fine", who="o'brien", at="2031-03-02T08:00:00+00:00")
    second = store.accept(NET, FIRST, reason="again", who="kim")
    assert store.acceptances(NET) == (first, second)
    assert (first.number, second.number) == (1, 2)
    assert first.reason == "looked at; \0 fine"
    assert datetime.fromisoformat(second.at).utcoffset() == timedelta(0)
    with pytest.raises(NotInStore, match="nothing to accept"):
        store.accept(NET, date(2031, 9, 9), reason="x", who="y")


def test_run_reports_are_kept_and_replaced_by_their_id(store):
    report = RunReport(
        "r1", NET, FIRST, "failed", (StageReport("score", "failed", 1.5, 3, "no"),), 99.5, "0.1", "c", "i"
    )
    east = timezone(timedelta(hours=5))
    store.record_run(
        report, started=datetime(2031, 3, 2, 7, tzinfo=east), finished=datetime(2031, 3, 2, 8, tzinfo=east)
    )
    done = dataclasses.replace(report, outcome="published")
    store.record_run(done, started=datetime(2031, 3, 2, 3, tzinfo=UTC), finished=datetime(2031, 3, 2, 4, tzinfo=UTC))
    newer = dataclasses.replace(report, run_id="r2")
    store.record_run(newer, started=datetime(2031, 3, 3, 3, tzinfo=UTC), finished=datetime(2031, 3, 3, 4, tzinfo=UTC))
    with Reader.open(store.workspace) as reader:
        runs = reader.runs(NET)
    assert [(run.run_id, run.outcome, run.started) for run in runs] == [
        ("r2", "failed", "2031-03-03T03:00:00.000+00:00"),
        ("r1", "published", "2031-03-02T03:00:00.000+00:00"),
    ]
    assert runs[1].report["stages"][0] == {
        "stage": "score",
        "outcome": "failed",
        "seconds": 1.5,
        "rows": 3,
        "detail": "no",
    }


def test_aliases_are_replaced_as_a_whole_or_left(store):
    row = stage_night(store, FIRST)
    alias = AliasRow(NET, "new'\0name", 3, FIRST, True)
    row = store.publish(row, aliases=[alias])
    assert queries.aliases(store.catalog.ask, NET) == (alias,)
    stage_night(store, FIRST)
    row = store.publish(row)
    assert queries.aliases(store.catalog.ask, NET) == (alias,)
    stage_night(store, FIRST)
    store.publish(row, aliases=[])
    assert queries.aliases(store.catalog.ask, NET) == ()


HOLD = """
import sys, time
from pathlib import Path
from swaygauge.store import Store
with Store.open(Path(sys.argv[1])) as store, store.lock("ostrel"):
    print("held", flush=True)
    time.sleep(600)
"""


def test_a_network_is_held_by_one_run_until_it_ends_or_dies(store):
    with store.lock(NET):
        with pytest.raises(Busy, match="another run holds it"), store.lock(NET):
            pass
        with store.lock("tidemark"):
            pass
    with store.lock(NET):
        pass
    holder = subprocess.Popen([sys.executable, "-c", HOLD, str(store.workspace)], stdout=subprocess.PIPE, text=True)
    with holder:
        assert holder.stdout.readline() == "held\n"
        with pytest.raises(Busy, match=f"process {holder.pid}"), store.lock(NET):
            pass
        holder.kill()
        holder.wait()
        with store.lock(NET):
            pass


STAGE = """
import sys
from datetime import date, timedelta
from pathlib import Path
sys.path.insert(0, sys.argv[3])
from example_nights import run_night, first_nights
from swaygauge.store import Store
with Store.open(Path(sys.argv[1])) as store:
    for night in first_nights(12)[int(sys.argv[2])::2]:
        store.stage_fact("ostrel", night, name="x", value=1)
        store.clear_staging("ostrel", night)
        run_night(store, night)
"""


def test_two_writers_of_one_catalog_do_not_disturb_each_other(tmp_path):
    here = str(Path(__file__).parent)
    work = tmp_path / "work"
    writers = [subprocess.Popen([sys.executable, "-c", STAGE, str(work), start, here]) for start in ("0", "1")]
    assert [writer.wait(timeout=120) for writer in writers] == [0, 0]
    with Store.open(work) as store:
        assert [row.night for row in store.nights(NET)] == first_nights(12)
        assert all(store.part(NET, night, kind="raw")["source"].size == 50 for night in first_nights(12))
        assert len(store.names(NET)) == 50


def test_a_writer_that_does_not_end_makes_the_next_one_give_up(store, monkeypatch):
    store.stage_fact(NET, FIRST, name="x", value=1)
    monkeypatch.setattr(catalog, "PRAGMAS", ("busy_timeout=50", *catalog.PRAGMAS[1:]))
    with Store.open(store.workspace) as second, store.catalog.writing():
        with pytest.raises(Busy, match="another process kept it locked"):
            second.stage_fact(NET, FIRST, name="x", value=2)
        assert second.fact(NET, FIRST, name="x", staged=True) == 1  # reading does not wait


def test_a_write_that_fails_leaves_nothing_beside_the_place(store, monkeypatch):
    def full(_):
        raise OSError(28, "No space left on device")

    with monkeypatch.context() as patch:
        patch.setattr(os, "fsync", full)
        with pytest.raises(OSError, match="No space left"):
            files_module.write_whole(store.workspace / "x.parquet", b"abc", files_module.sha256_of(b"abc"))
    assert [path.name for path in store.workspace.iterdir() if "parquet" in path.name] == []


def test_a_fact_has_a_plain_name(store):
    for name in ("", "A b", "../x", "x" * 65, "x;"):
        with pytest.raises(StoreError, match="a fact cannot be called"):
            store.stage_fact(NET, FIRST, name=name, value=1)


def test_the_journal_is_plain_json(store):
    run_night(store, FIRST)
    sql = "SELECT facts FROM alert WHERE network = :network"
    assert json.loads(store.catalog.ask(sql, network=NET)[0][0]) == {"new_links": 12, "p": 1e-9}
