"""The shipped demo world through the night: each planted event is raised as its kind, quiet nights stay quiet.

The truth file is the generator's; no threshold was chosen on this world's seed.
"""

from __future__ import annotations

import json
import shutil
from datetime import date, timedelta
from pathlib import Path
from typing import Any

import pytest
from night.support import reader_of, run_all

from swaygauge.night import Work
from swaygauge.records import MOVED, Moves
from swaygauge.store.checkup import checkup
from swaygauge.store.rows import AlertRow

OSTREL = Path(__file__).parents[2] / "demo_data" / "ostrel"
TRUTH: dict[str, Any] = json.loads((OSTREL / "truth.json").read_text(encoding="utf-8"))
PARTIAL = date(2031, 3, 27)


@pytest.fixture(scope="module")
def ostrel(tmp_path_factory: pytest.TempPathFactory) -> Work:
    """All nights, the late file delivered after the others."""
    folder = tmp_path_factory.mktemp("ostrel")
    shutil.copytree(OSTREL, folder / "in", ignore=shutil.ignore_patterns("late"))
    file = folder / "ostrel.toml"
    file.write_text(
        'network = "ostrel"\nworkspace = "ws"\n[snapshots]\nfolder = "in"\naliases = "in/aliases.csv"\n'
        '[reader]\nendorser = "from_site"\nendorsed = "to_site"\n'
    )
    run_all(file)
    for late in (OSTREL / "late").iterdir():
        shutil.copy2(late, folder / "in" / late.name)
    return run_all(file)[0]


def alerts_of(work: Work, first: date, last: date) -> tuple[AlertRow, ...]:
    return reader_of(work).alerts(work.network, first=first, last=last)


def window(event: dict[str, Any]) -> tuple[date, date]:
    start = date.fromisoformat(event.get("material_from", event["night"]))
    first = date.fromisoformat(event["night"])
    return first, start + timedelta(days=event["within"])


EVENTS = [event for event in TRUTH["events"] if event["expected"]]


@pytest.mark.parametrize("event", EVENTS, ids=lambda event: event["event"].replace(" ", "-"))
def test_every_planted_event_is_raised_as_its_kind_on_its_night(ostrel: Work, event: dict[str, Any]) -> None:
    kind = event["expected"].replace(" ", "_")
    raised = [alert for alert in alerts_of(ostrel, *window(event)) if alert.kind == kind]
    if kind == "lambda_jump":
        named = reader_of(ostrel).names(ostrel.network, raised[0].facts["nodes"]).values()
        assert set(event["nodes"]) <= set(named), "every member of the ring is named"
        return
    assert set(event["nodes"]) <= {alert.node_name for alert in raised}
    assert {alert.direction for alert in raised if alert.node_name in event["nodes"]} == {event["direction"]}


def test_quiet_nights_show_two_alerts_at_most_on_average(ostrel: Work) -> None:
    planted = {node for event in TRUTH["events"] for node in [*event["nodes"], *event["sources"]]}
    quiet = [date.fromisoformat(night) for night in TRUTH["quiet_nights"]]
    counts = []
    for night in quiet:
        told = alerts_of(ostrel, night, night)
        counts.append(sum(alert.node_name not in planted for alert in told if alert.node >= 0))
    assert sum(counts) / len(counts) <= 2.0


def test_the_partial_crawl_is_repaired_and_raises_no_false_falls(ostrel: Work) -> None:
    row = ostrel.store.night_row(ostrel.network, PARTIAL)
    assert row is not None
    assert (row.state, row.outcome) == ("published", "repair")
    for score in ("katz", "fairshare"):
        moves = ostrel.store.record(Moves, ostrel.network, PARTIAL, kind="moves", score=score)
        watched = (moves.status == MOVED) & (moves.rank_before <= 1000)
        # a third of the sources are dark; a usual night moves a handful of watched nodes down by half an octave
        assert int((watched & (moves.octaves < -0.585)).sum()) <= 10
        assert not ((moves.status == 2) & (moves.rank_before <= 1000)).any()
    fell = [alert for alert in alerts_of(ostrel, PARTIAL, PARTIAL) if alert.direction == "fell"]
    assert len(fell) <= 2, "no more than a quiet night shows"


def test_the_rename_keeps_its_history(ostrel: Work) -> None:
    event = next(event for event in TRUTH["events"] if event["event"] == "rename")
    reader = reader_of(ostrel)
    old, new = (reader.find_node(ostrel.network, name)[0] for name in event["nodes"])
    assert old.node == new.node
    points = {point.night: point for point in reader.trace(ostrel.network, new.node, score="katz")}
    renamed = date.fromisoformat(event["night"])
    before, after = points[renamed - timedelta(days=1)].rank, points[renamed].rank
    assert before is not None
    assert after is not None
    assert abs(before - after) <= 10
    assert reader.names(ostrel.network, [new.node])[new.node] == event["nodes"][1], "the newest name is shown"


def test_the_missing_night_is_marked_and_the_late_one_is_there(ostrel: Work) -> None:
    rows = {row.night: row for row in ostrel.store.nights(ostrel.network)}
    missing = date.fromisoformat(next(f["night"] for f in TRUTH["faults"] if f["fault"] == "missing night"))
    late = date.fromisoformat(next(f["night"] for f in TRUTH["faults"] if f["fault"] == "late file"))
    assert missing not in rows
    assert rows[missing + timedelta(days=1)].gap_nights == 1
    assert rows[late].state == "published"
    assert rows[late + timedelta(days=1)].previous == late
    assert len(rows) == 44


def test_the_store_is_sound(ostrel: Work) -> None:
    assert [finding for finding in checkup(ostrel.store, ostrel.network) if finding.level != "note"] == []
