"""The night as one whole: what is stored, what is due, what a re-run gives."""

from __future__ import annotations

from collections.abc import Callable
from datetime import UTC, date, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest
from night.support import bytes_of, digests, reader_of, run_all
from tests_support import FIRST, MiniWorld, write_gzip, write_night, write_settings

from swaygauge.errors import Busy
from swaygauge.night import run_due, stages
from swaygauge.records import LinkBook, Moves, Pin, ScoreSet, SpectralBounds
from swaygauge.store.checkup import checkup

Mini = Callable[..., Path]


def day(number: int) -> date:
    return FIRST + timedelta(days=number)


def test_nights_are_scored_in_date_order_and_the_store_is_sound(mini: Mini) -> None:
    work, outcomes = run_all(mini(5))
    assert [outcome.night for outcome in outcomes] == [day(number) for number in range(5)]
    assert {outcome.outcome for outcome in outcomes} == {"published"}
    for score in ("katz", "fairshare"):
        scores = work.store.record(ScoreSet, work.network, day(4), kind="scores", score=score)
        assert np.isfinite(scores.value).all()
        assert (scores.value - scores.bound >= 1.0 - 1e-9).all()
        assert (scores.best <= scores.rank).all()
        assert (scores.rank <= scores.worst).all()
        moves = work.store.record(Moves, work.network, day(4), kind="moves", score=score)
        assert moves.previous == day(3)
    assert [finding for finding in checkup(work.store, work.network) if finding.level == "damaged"] == []


def test_nothing_is_due_twice(mini: Mini) -> None:
    file = mini(3)
    run_all(file)
    assert run_all(file)[1] == []


def test_a_re_run_gives_the_same_bytes(mini: Mini, tmp_path: Path) -> None:
    file = mini(12)
    work, _ = run_all(file)
    before, files = digests(work), bytes_of(tmp_path / "ws")
    _, again = run_all(file, again=True)
    assert len(again) == 12
    assert digests(work) == before
    assert bytes_of(tmp_path / "ws") == files


def test_two_workspaces_from_the_same_files_hold_the_same_bytes(tmp_path: Path) -> None:
    kept = []
    for name in ("a", "b"):
        (tmp_path / name).mkdir()
        file = write_settings(tmp_path / name)
        MiniWorld().write(tmp_path / name / "in", 4)
        work, _ = run_all(file)
        kept.append((digests(work), bytes_of(tmp_path / name / "ws")))
    assert kept[0] == kept[1]


def test_a_night_between_is_a_gap_and_its_late_file_replays_what_rests_on_it(mini: Mini, tmp_path: Path) -> None:
    file = mini(6, skip=[3])
    work, _ = run_all(file)
    row = work.store.night_row(work.network, day(4))
    assert row is not None
    assert (row.previous, row.gap_nights) == (day(2), 1)
    world = MiniWorld()
    for _ in range(3):
        world.step()
    write_night(tmp_path / "in", day(3), world.links)
    _, outcomes = run_all(file)
    assert [outcome.night for outcome in outcomes] == [day(3), day(4), day(5)]
    straight = tmp_path / "straight"
    straight.mkdir()
    whole = write_settings(straight)
    MiniWorld().write(straight / "in", 6)
    assert digests(run_all(whole)[0]) == digests(work)


def test_a_replaced_file_replays_what_rests_on_it(mini: Mini, tmp_path: Path) -> None:
    file = mini(4)
    work, _ = run_all(file)
    world = MiniWorld()
    world.step()
    write_night(tmp_path / "in", day(1), world.links | {("late.example", "n000.example")})
    _, outcomes = run_all(file)
    assert [outcome.night for outcome in outcomes] == [day(1), day(2), day(3)]
    assert outcomes[0].why == "its file has changed"
    assert len(work.store.names(work.network)) == 121


def test_a_touched_but_equal_file_is_not_due(mini: Mini, tmp_path: Path) -> None:
    file = mini(3)
    run_all(file)
    path = tmp_path / "in" / f"links-{day(1)}.csv"
    path.write_bytes(path.read_bytes())
    assert run_all(file)[1] == []


def test_half_a_crawl_is_repaired_and_nobody_falls(mini: Mini, tmp_path: Path) -> None:
    file = mini(10)
    world = MiniWorld()
    for _ in range(10):
        world.step()
    dark = set(world.random.sample(world.names, 48))
    write_night(tmp_path / "in", day(10), {link for link in world.links if link[0] not in dark})
    work, _ = run_all(file)
    row = work.store.night_row(work.network, day(10))
    assert row is not None
    assert (row.state, row.outcome, row.degraded) == ("published", "repair", True)
    moves = work.store.record(Moves, work.network, day(10), kind="moves", score="katz")
    assert moves.octaves[moves.octaves < -1].size == 0
    assert (moves.status == 0).all(), "a node that was not fetched has not departed"


def test_a_ruined_snapshot_is_held_and_can_be_accepted_with_a_reason(mini: Mini, tmp_path: Path) -> None:
    file = mini(5)
    world = MiniWorld()
    for _ in range(5):
        world.step()
    write_night(tmp_path / "in", day(5), sorted(world.links)[:40])
    world.step()
    write_night(tmp_path / "in", day(6), world.links)
    work, outcomes = run_all(file)
    assert [outcome.outcome for outcome in outcomes[-2:]] == ["held", "published"]
    assert not work.store.has_part(work.network, day(5), kind="scores", score="katz")
    assert work.store.has_part(work.network, day(5), kind="raw"), "a held snapshot is kept"
    assert [alert.kind for alert in reader_of(work).alerts(work.network, first=day(5), last=day(5))] == ["held"]
    row = work.store.night_row(work.network, day(6))
    assert row is not None
    assert row.previous == day(4)
    work.store.accept(work.network, day(5), reason="the crawler's operator confirms it", who="tester")
    _, outcomes = run_all(file)
    assert [(outcome.night, outcome.outcome) for outcome in outcomes] == [(day(5), "published"), (day(6), "published")]
    accepted = work.store.night_row(work.network, day(5))
    assert accepted is not None
    assert accepted.degraded
    assert accepted.reason == "the crawler's operator confirms it"


@pytest.mark.parametrize(
    ("content", "told"),
    [
        (b"source,target\na,b\nc\n", "line 3"),
        (b"from,target\na,b\n", "source"),
        (b"", "empty"),
        (b"source,target\n", "no link"),
        (b"source,target\na,\xff\n", "UTF-8"),
        (b"source,target\na," + b"x" * 10_240 + b"\n", "10,240"),
    ],
    ids=["short row", "missing column", "empty", "header only", "not UTF-8", "10 kB name"],
)
def test_a_bad_file_is_refused_and_nothing_is_lost(mini: Mini, tmp_path: Path, content: bytes, told: str) -> None:
    file = mini(3)
    (tmp_path / "in" / f"links-{day(1)}.csv").write_bytes(content)
    work, outcomes = run_all(file)
    assert [outcome.outcome for outcome in outcomes] == ["published", "refused", "published"]
    assert told in outcomes[1].detail
    row = work.store.night_row(work.network, day(1))
    assert row is not None
    assert row.state == "refused"
    assert told in row.reason
    assert run_all(file)[1] == [], "the same bad file is not read again"
    world = MiniWorld()
    world.step()
    write_night(tmp_path / "in", day(1), world.links)
    assert [outcome.night for outcome in run_all(file)[1]] == [day(1), day(2)]


def test_a_bad_replacement_leaves_the_stored_night_alone(mini: Mini, tmp_path: Path) -> None:
    file = mini(3)
    work, _ = run_all(file)
    before = digests(work)
    (tmp_path / "in" / f"links-{day(1)}.csv").write_bytes(b"source,target\na\n")
    _, outcomes = run_all(file)
    assert [outcome.outcome for outcome in outcomes] == ["refused"]
    assert digests(work) == before


def test_two_files_for_one_night_and_an_impossible_date_stop_no_other_night(tmp_path: Path) -> None:
    file = write_settings(tmp_path)
    MiniWorld().write(tmp_path / "in", 3)
    twin = tmp_path / "in" / f"links-{day(1)}.csv.gz"
    write_gzip(twin, (tmp_path / "in" / f"links-{day(1)}.csv").read_text())
    (tmp_path / "in" / "links-2030-02-30.csv").write_text("source,target\na,b\n")
    _, outcomes = run_all(file)
    unclear = [outcome.detail for outcome in outcomes if outcome.outcome == "unclear"]
    assert any(twin.name in detail for detail in unclear)
    assert any("links-2030-02-30.csv" in detail for detail in unclear)
    assert [outcome.night for outcome in outcomes if outcome.outcome == "published"] == [day(0), day(2)]


def test_a_rename_keeps_its_history_with_an_alias_and_loses_it_without(tmp_path: Path) -> None:
    old, new = "n000.example", "renamed.example"
    kept = {}
    for name, aliased in (("with", True), ("without", False)):
        folder = tmp_path / name
        folder.mkdir()
        snapshots = 'aliases = "aliases.csv"' if aliased else ""
        if aliased:
            (folder / "aliases.csv").write_text(f"old,new,valid_from\n{old},{new},{day(3)}\n")
        file = write_settings(folder, snapshots=snapshots)
        world = MiniWorld()
        for number in range(5):
            links = world.links
            if number >= 3:
                links = {(new if s == old else s, new if t == old else t) for s, t in links}
            write_night(folder / "in", day(number), links)
            world.step()
        work, _ = run_all(file)
        reader = reader_of(work)
        node = reader.find_node(work.network, new)[0].node
        points = reader.trace(work.network, node, score="katz")
        kept[name] = [point.night for point in points if point.rank is not None]
    assert kept["with"] == [day(number) for number in range(5)]
    assert kept["without"] == [day(3), day(4)]


def test_an_alias_added_later_replays_the_nights_it_is_valid_for(tmp_path: Path) -> None:
    (tmp_path / "aliases.csv").write_text("old,new,valid_from\n")
    file = write_settings(tmp_path, snapshots='aliases = "aliases.csv"')
    MiniWorld().write(tmp_path / "in", 4)
    run_all(file)
    (tmp_path / "aliases.csv").write_text(f"old,new,valid_from\nn001.example,other.example,{day(2)}\n")
    assert [outcome.night for outcome in run_all(file)[1]] == [day(2), day(3)]


def test_an_acyclic_network_is_scored_with_lambda_exactly_zero(tmp_path: Path) -> None:
    file = write_settings(tmp_path)
    write_night(tmp_path / "in", day(0), {("a", "b"), ("b", "c"), ("a", "c"), ("c", "d")})
    work, _ = run_all(file)
    bounds = work.store.record(SpectralBounds, work.network, day(0), kind="bounds")
    assert (bounds.lower, bounds.upper) == (0.0, 0.0)
    assert work.store.record(Pin, work.network, day(0), kind="pin").alpha == 0.5
    katz = work.store.record(ScoreSet, work.network, day(0), kind="scores", score="katz")
    names = work.store.names(work.network).texts(katz.ids)
    value = dict(zip(names, katz.value.tolist(), strict=True))
    # by hand: a 1, b 1.5, c 1 + .5 (1 + 1.5), d 1 + .5 c
    assert value == pytest.approx({"a": 1.0, "b": 1.5, "c": 2.25, "d": 2.125}, abs=1e-12)
    leaks = work.store.fact(work.network, day(0), name="leaks")
    assert leaks["zeroed_count"] == 3


def test_a_new_era_re_scores_last_night_at_the_new_alpha(tmp_path: Path) -> None:
    file = write_settings(tmp_path)
    world = MiniWorld(nodes=200)
    world.write(tmp_path / "in", 3)
    ring = [f"ring{number:02d}.example" for number in range(14)]
    dense = {(a, b) for a in ring for b in ring if a != b}
    write_night(tmp_path / "in", day(3), world.links | dense)
    work, _ = run_all(file)
    before = work.store.record(Pin, work.network, day(2), kind="pin")
    now = work.store.record(Pin, work.network, day(3), kind="pin")
    assert (before.night, now.night) == (day(0), day(3))
    assert now.alpha < before.alpha
    bridge = work.store.record(ScoreSet, work.network, day(3), kind="bridge", score="katz")
    assert (bridge.night, bridge.alpha) == (day(2), now.alpha)
    alerts = reader_of(work).alerts(work.network, first=day(3), last=day(3), kind="lambda_jump")
    assert len(alerts) == 1
    assert "ring" in alerts[0].sentence


def test_an_overdue_night_is_noted_once_and_goes_when_its_file_arrives(mini: Mini, tmp_path: Path) -> None:
    file = mini(3, snapshots='deadline = "06:00"')
    before = datetime(2030, 1, 5, 5, 59, tzinfo=UTC)
    work, outcomes = run_all(file, now=before)
    assert "overdue" not in {outcome.outcome for outcome in outcomes}
    _, outcomes = run_all(file, now=datetime(2030, 1, 5, 6, 0, tzinfo=UTC))
    assert [(outcome.night, outcome.outcome) for outcome in outcomes] == [(day(3), "overdue")]
    row = work.store.night_row(work.network, day(3))
    assert row is not None
    assert row.state == "missing"
    world = MiniWorld()
    for _ in range(3):
        world.step()
    write_night(tmp_path / "in", day(3), world.links)
    assert [outcome.outcome for outcome in run_all(file)[1]] == ["published"]


def test_only_one_run_holds_a_network(mini: Mini) -> None:
    work, _ = run_all(mini(1))
    with work.store.lock(work.network), pytest.raises(Busy):
        run_due(work)


def test_a_run_report_is_kept_of_every_night_failed_ones_too(mini: Mini, monkeypatch: pytest.MonkeyPatch) -> None:
    file = mini(2)
    work, _ = run_all(file, end=day(0))

    def crash(_work: object, _night: date) -> None:
        raise OSError("disk on fire")

    monkeypatch.setitem(stages.STAGES, "score", crash)
    with pytest.raises(OSError, match="disk on fire"):
        run_all(file)
    monkeypatch.undo()
    newest, first = reader_of(work).runs(work.network)
    assert (newest.outcome, first.outcome) == ("failed", "published")
    assert newest.report["stages"][-1]["detail"] == "disk on fire"
    assert [stage["stage"] for stage in first.report["stages"]] == list(stages.STAGES)
    assert first.report["peak_mib"] > 0
    assert [outcome.outcome for outcome in run_all(file)[1]] == ["published"]


def test_own_importance_per_node_comes_from_a_file(tmp_path: Path) -> None:
    (tmp_path / "beta.csv").write_text("name,value\nn005.example,3.5\n")
    file = write_settings(tmp_path, snapshots='beta = "beta.csv"')
    links = {("n005.example", "n001.example"), ("n001.example", "n002.example")}
    write_night(tmp_path / "in", day(0), links)
    work, _ = run_all(file)
    katz = work.store.record(ScoreSet, work.network, day(0), kind="scores", score="katz")
    names = work.store.names(work.network).texts(katz.ids)
    assert dict(zip(names, katz.value.tolist(), strict=True))["n005.example"] == 3.5


def test_a_fetch_list_says_which_sources_were_not_crawled(tmp_path: Path) -> None:
    file = write_settings(tmp_path, snapshots='fetched = "fetched-{night}.txt"')
    world = MiniWorld()
    sources = sorted({source for source, _ in world.links})
    missing = sources[3]
    write_night(tmp_path / "in", day(0), world.links)
    write_night(tmp_path / "in", day(1), {link for link in world.links if link[0] != missing})
    (tmp_path / "in" / f"fetched-{day(0)}.txt").write_text("\n".join(sources))
    (tmp_path / "in" / f"fetched-{day(1)}.txt").write_text("\n".join(name for name in sources if name != missing))
    work, _ = run_all(file)
    book = work.store.record(LinkBook, work.network, day(1), kind="book")
    assert int(book.in_effect.sum()) == len(world.links)
