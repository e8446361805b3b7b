"""The measured facts, by hand on small cases and against SQL in DuckDB on random ones."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from datetime import date

import duckdb
import numpy as np
import pyarrow as pa
import pytest

from swaygauge.checks.profile import measure
from swaygauge.effective import advance, start_book
from swaygauge.records import GONE, LinkBook, Origin, Profile, Snapshot, Verdict

Lists = dict[int, list[int]]
Measured = Callable[..., Profile]

# Six sources with 5 links each, four with 2, two with 1.
BEFORE: Lists = {
    **{s: [100, 101, 102, 103, 104 + s] for s in range(6)},
    **{s: [100, 120 + s] for s in range(6, 10)},
    10: [100],
    11: [101],
}


@pytest.fixture
def compare(snapshot_of: Callable[..., Snapshot]) -> Measured:
    def run(tonight: Lists, before: Lists = BEFORE, **options: object) -> Profile:
        first = snapshot_of(before, 0)
        book = start_book(first)
        return measure(snapshot_of(tonight, 1, **options), book, trailing=[measure(first, None)])

    return run


def test_first_night_has_counts_and_no_comparison(snapshot_of: Callable[..., Snapshot]) -> None:
    raw = snapshot_of(BEFORE, 0)
    origin = dataclasses.replace(raw.origin, rows=60, dropped=(("empty name", 3), ("bad weight", 2)))
    profile = measure(dataclasses.replace(raw, origin=origin, duplicates=15, self_links=4), None)
    assert (profile.links, profile.sources, profile.targets, profile.nodes) == (40, 12, 14, 26)
    assert (profile.rows, profile.duplicates, profile.self_links, profile.dropped) == (60, 15, 4, 5)
    assert (profile.duplicate_share, profile.dropped_share) == (0.25, 5 / 60)
    assert (profile.longest_list, profile.history) == (5, 0)
    assert (profile.weight_min, profile.weight_max, profile.weight_sum) == (1.0, 1.0, 40.0)
    compared = ("kept", "lost", "hub", "cut", "shrunk", "node_ratio", "link_ratio", "unfetched", "new_nodes")
    assert [getattr(profile, fact) for fact in compared] == [None] * len(compared)


def test_weights(snapshot_of: Callable[..., Snapshot]) -> None:
    profile = measure(snapshot_of({0: {1: 0.5, 2: 4.0}, 1: {2: 1.0}}, 0), None)
    assert (profile.weight_min, profile.weight_max, profile.weight_sum) == (0.5, 4.0, 5.5)


def test_nothing_changed(compare: Measured) -> None:
    p = compare(BEFORE)
    assert (p.kept, p.lost, p.hub, p.cut, p.shrunk, p.node_ratio, p.link_ratio) == (1, 0, 0, 0, 0, 1, 1)
    assert (p.base_links, p.base_sources, p.base_hubs, p.base_lists, p.base_nodes) == (40, 10, 6, 6, 26)


def test_churn(compare: Measured) -> None:
    tonight = {**BEFORE, 0: [100, 101], 1: [100, 101, 102], 2: [*BEFORE[2], 200], 10: []}
    del tonight[6], tonight[3]
    p = compare(tonight)
    # Lost: 3 of source 0, 2 of 1, 5 of 3, 2 of 6, 1 of 10.
    assert p.kept == (40 - 13) / 40
    assert p.lost == 2 / 10  # sources 3 and 6; source 10 had one link
    assert p.hub == 2 / 6  # sources 0 and 3
    assert p.shrunk == 2 / 6  # sources 0 and 1; source 3 lost all
    assert p.link_ratio == 28 / 40


def test_cut_lists(compare: Measured) -> None:
    p = compare({s: targets[:4] for s, targets in BEFORE.items()})
    assert (p.cut, p.longest_list, p.shrunk) == (6, 4, 0)


def test_hubs_are_the_hundred_largest(compare: Measured) -> None:
    before = {s: list(range(1000, 1000 + (20 if s < 100 else 6))) for s in range(150)}
    tonight = {s: targets[:2] if s in (5, 120) else targets for s, targets in before.items()}
    p = compare(tonight, before)
    assert (p.hub, p.base_hubs) == (1 / 100, 100)


def test_a_fetch_list_takes_the_unfetched_out_of_every_share(compare: Measured) -> None:
    fetched = [s for s in BEFORE if s not in (0, 1, 6, 10)]
    tonight = {s: BEFORE[s] for s in fetched if s != 7}  # 7 was crawled and is empty
    p = compare(tonight, fetched=fetched)
    assert (p.fetch_list, p.unfetched) == (True, 3 / 10)
    assert (p.base_links, p.base_sources, p.base_lists) == (40 - 13, 7, 4)
    assert p.kept == 25 / 27
    assert p.lost == 1 / 7
    assert (p.hub, p.shrunk) == (0, 0)


def test_nothing_fetched_that_was_known(compare: Measured) -> None:
    p = compare({50: [100]}, fetched=[50])
    assert (p.unfetched, p.kept, p.lost) == (1.0, 1.0, 0.0)


def test_new_nodes(snapshot_of: Callable[..., Snapshot]) -> None:
    tonight = snapshot_of({0: [1, 2], 9: [1]}, 0)
    known = np.array([0, 1, 500], dtype=np.int32)
    assert measure(tonight, None, known_nodes=known).new_nodes == 0.5
    assert measure(tonight, None, known_nodes=known[:0]).new_nodes == 1.0


def test_ratios_are_to_the_median_of_the_last_fourteen(snapshot_of: Callable[..., Snapshot]) -> None:
    first = measure(snapshot_of(BEFORE, 0), None)
    trailing = [dataclasses.replace(first, nodes=n) for n in [1000] * 5 + [10] * 7 + [20] * 7]
    p = measure(snapshot_of(BEFORE, 1), start_book(snapshot_of(BEFORE, 0)), trailing=trailing)
    assert (p.base_nodes, p.node_ratio, p.history) == (15.0, 26 / 15, 14)


def test_compares_with_what_was_in_effect_not_with_what_arrived(snapshot_of: Callable[..., Snapshot]) -> None:
    first = snapshot_of(BEFORE, 0)
    part = snapshot_of({s: ts for s, ts in BEFORE.items() if s > 0}, 1)
    book, _, _ = advance(start_book(first), part, Verdict("fine", ()))  # carries source 0
    p = measure(dataclasses.replace(part, night=date(2030, 1, 3)), book, trailing=[measure(first, None)] * 2)
    assert (p.base_links, p.kept, p.lost) == (40, 35 / 40, 1 / 10)


def test_book_and_trailing_belong_together(snapshot_of: Callable[..., Snapshot]) -> None:
    raw = snapshot_of(BEFORE, 0)
    with pytest.raises(ValueError, match="belong together"):
        measure(raw, start_book(raw))
    with pytest.raises(ValueError, match="belong together"):
        measure(raw, None, trailing=[measure(raw, None)])


SQL = """
with b as (select source, target from book where state < 3),
j as (
    select b.source, count(*) before, count(now.source) again
    from b left join now using (source, target) group by b.source),
o as (select source, count(*) out from now group by source),
s as (select j.*, coalesce(out, 0) out, (select max(out) from o) longest from j left join o using (source)),
hubs as (select * from s where before >= 5 order by before desc, source limit 100)
select
    (select count(*) from now), (select count(distinct source) from now), (select count(distinct target) from now),
    (select count(*) from (select source from now union select target from now)), (select max(out) from o),
    (select sum(again) / sum(before) from s),
    (select count(*) filter (where out = 0) / count(*) from s where before >= 2),
    (select count(*) filter (where 2 * again < before) / count(*) from hubs),
    (select count(*) from s where before > longest and out = longest),
    (select count(*) filter (where out > 0 and before - again > 0.2 * before) / count(*) from s where before >= 5)
"""


@pytest.mark.parametrize("seed", range(5))
def test_agrees_with_sql(seed: int) -> None:
    rng = np.random.default_rng(seed)

    def table(rows: int) -> tuple[np.ndarray, np.ndarray]:
        pairs = np.unique(np.minimum(rng.pareto(0.7, (rows, 2)) * 5, 199).astype(np.int32), axis=0)
        return pairs[:, 0].copy(), pairs[:, 1].copy()

    target, source = table(4000)
    state = rng.choice([0, 1, 2, GONE], len(target), p=[0.85, 0.05, 0.05, 0.05]).astype(np.uint8)
    book = LinkBook(date(2030, 1, 1), source, target, None, state, np.zeros(len(state), np.uint8))
    stay = (rng.random(len(target)) < 0.8) & (source % 11 > 0)
    new_target, new_source = table(300)
    pairs = np.unique(np.c_[np.r_[target[stay], new_target], np.r_[source[stay], new_source]], axis=0)
    now = Snapshot(date(2030, 1, 2), pairs[:, 1].copy(), pairs[:, 0].copy(), None, Origin("x", "0", 1, "csv", 1))
    p = measure(now, book, trailing=[measure(dataclasses.replace(now, night=date(2030, 1, 1)), None)])

    with duckdb.connect() as connection:
        connection.register("book", pa.table({"source": source, "target": target, "state": state}))
        connection.register("now", pa.table({"source": now.source, "target": now.target}))
        (expected,) = connection.execute(SQL).fetchall()
    ours = (p.links, p.sources, p.targets, p.nodes, p.longest_list, p.kept, p.lost, p.hub, p.cut, p.shrunk)
    assert ours == pytest.approx(expected, rel=1e-12)
    assert p.shrunk
    assert p.lost


def test_a_hub_that_stays_away_is_counted_on_the_night_it_went(snapshot_of: Callable[..., Snapshot]) -> None:
    raw = snapshot_of(BEFORE, 0)
    book, trailing = start_book(raw), [measure(raw, None)]
    away = {source: targets for source, targets in BEFORE.items() if source != 3}
    hubs, lost = [], []
    for day in (1, 2, 3):
        tonight = snapshot_of(away, day)
        profile = measure(tonight, book, trailing=trailing)
        hubs.append(profile.hub)
        lost.append(profile.lost)
        book, _, _ = advance(book, tonight, Verdict("fine", ()))
        trailing.append(profile)
    assert hubs == [1 / 6, 0, 0]
    assert lost == [1 / 10] * 3  # a source that is not fetched is missing as long as it is
