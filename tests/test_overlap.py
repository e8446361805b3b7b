"""Matching two sorted link tables, against Python sets."""

from __future__ import annotations

from datetime import date

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from swaygauge.overlap import link_keys, overlap, spliced
from swaygauge.records import CARRIED, GONE, SEEN, LinkBook, Origin, Snapshot

Links = dict[tuple[int, int], int]  # (target, source) -> state

node = st.integers(0, 9)
links = st.dictionaries(st.tuples(node, node), st.sampled_from([SEEN, CARRIED, GONE]), max_size=40)


def columns(rows: list[tuple[int, int]]) -> tuple[np.ndarray, np.ndarray]:
    table = np.array(rows, dtype=np.int32).reshape(-1, 2)
    return table[:, 0].copy(), table[:, 1].copy()


def book_of(rows: Links) -> LinkBook:
    target, source = columns(sorted(rows))
    state = np.array([rows[row] for row in sorted(rows)], dtype=np.uint8)
    return LinkBook(date(2030, 1, 1), source, target, None, state, np.zeros(len(rows), dtype=np.uint8))


def snapshot_of(rows: Links, fetched: list[int] | None = None) -> Snapshot:
    target, source = columns(sorted(rows))
    known = None if fetched is None else np.array(sorted(fetched), dtype=np.int32)
    return Snapshot(date(2030, 1, 2), source, target, None, Origin("x", "0", 1, "csv", len(rows)), fetched=known)


@given(links, links)
def test_counts_equal_those_of_sets(before: Links, tonight: Links) -> None:
    match = overlap(book_of(before), snapshot_of(tonight))
    standing = {row for row, state in before.items() if state < GONE}
    assert match.seen.tolist() == [row in tonight for row in sorted(before)]
    assert match.known.tolist() == [row in before for row in sorted(tonight)]
    for source in range(len(match.now)):
        own = {row for row in standing if row[1] == source}
        assert match.before[source] == len(own)
        assert match.again[source] == len(own & tonight.keys())
        assert match.now[source] == sum(row[1] == source for row in tonight)
    merged = spliced(
        link_keys(*columns(sorted(before))), link_keys(*columns(sorted(tonight)))[~match.known], match.at[~match.known]
    )
    assert merged.tolist() == link_keys(*columns(sorted(before | tonight))).tolist()


def test_keys_keep_the_order_up_to_the_largest_id() -> None:
    top = np.iinfo(np.int32).max
    keys = link_keys(np.array([0, 0, 1, top, top], np.int32), np.array([0, top, 0, 0, top], np.int32))
    assert np.all(np.diff(keys) > 0)


def test_a_source_with_links_counts_as_fetched_even_when_the_list_forgot_it() -> None:
    match = overlap(book_of({(1, 0): SEEN, (1, 2): SEEN}), snapshot_of({(1, 0): SEEN}, fetched=[3]))
    assert match.fetched is not None
    assert match.fetched.tolist() == [True, False, False, True]


def lists(sizes: dict[int, int]) -> Links:
    return {(100 + i, source): SEEN for source, size in sizes.items() for i in range(size)}


def test_cut_means_longer_before_and_exactly_the_longest_list_tonight() -> None:
    before = lists({0: 9, 1: 8, 2: 6, 3: 6, 4: 9})
    match = overlap(book_of(before), snapshot_of(lists({0: 6, 1: 6, 2: 6, 3: 5, 4: 0})))
    assert np.flatnonzero(match.cut()).tolist() == [0, 1]


def test_shrunk_means_more_than_a_fifth_of_five_or_more_but_not_all() -> None:
    before = lists({0: 5, 1: 5, 2: 4, 3: 10, 4: 10, 5: 5})
    tonight = lists({0: 4, 1: 3, 2: 1, 3: 8, 4: 7, 5: 0})
    match = overlap(book_of(before), snapshot_of(tonight))
    assert np.flatnonzero(match.shrunk()).tolist() == [1, 4]
    assert np.flatnonzero(match.emptied()).tolist() == [5]
