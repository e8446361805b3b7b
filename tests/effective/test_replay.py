"""Random nights against the rules restated link by link on Python dictionaries; replay gives the same bytes."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from swaygauge.effective import UpkeepOptions, advance, start_book
from swaygauge.records import (
    CARRIED,
    EXPIRED,
    GONE,
    LOST,
    NEW,
    RETURNED,
    SEEN,
    WAITING,
    LinkBook,
    LinkChanges,
    Snapshot,
    Verdict,
)

Link = tuple[int, int]  # (target, source)
Twin = dict[Link, tuple[int, int]]  # link -> (state, nights absent)

OPTIONS = UpkeepOptions(carry_nights=2, memory=4, departed_links=2)

link = st.tuples(st.integers(0, 5), st.integers(0, 5)).filter(lambda pair: pair[0] != pair[1])
night = st.tuples(
    st.sets(link, min_size=1, max_size=24),
    st.booleans(),  # degraded
    st.one_of(st.none(), st.sets(st.integers(0, 5))),  # fetch list
)


def twin_step(book: Twin, links: set[Link], degraded: bool, fetched: set[int] | None) -> tuple[Twin, dict[Link, int]]:
    """One night by the letter of the rules (capped lists apart)."""
    standing = {pair for pair, (state, _) in book.items() if state < GONE}
    had = Counter(source for _, source in standing)
    has = Counter(source for _, source in links)
    reached = None if fetched is None else fetched | has.keys()

    def is_silent(source: int) -> bool:
        if reached is not None:
            return had[source] > 0 and source not in reached
        return had[source] >= (1 if degraded else 2) and not has[source]

    def is_departed(node: int) -> bool:
        if degraded or had[node] < 2 or has[node] or (reached is not None and node not in reached):
            return False
        endorsed = sum(target == node and not is_silent(source) for target, source in standing)
        endorsed_now = sum(target == node for target, _ in links)
        return endorsed >= OPTIONS.departed_links and endorsed - endorsed_now >= 0.8 * endorsed - 1e-9

    after: Twin = {}
    news: dict[Link, int] = {}
    for pair in book.keys() | links:
        target, source = pair
        state, absent = book.get(pair, (GONE, 0))
        in_effect = pair in standing
        if pair in links:
            after[pair] = (SEEN, 0)
            if not in_effect:
                news[pair] = RETURNED if pair in book else NEW
            continue
        absent += 1
        if not in_effect:
            state = GONE
        elif is_departed(source) or is_departed(target):
            state, news[pair] = GONE, LOST
        elif is_silent(source):
            if absent > OPTIONS.carry_nights:
                state, news[pair] = GONE, EXPIRED
            else:
                state = WAITING if state == WAITING else CARRIED
        elif state == WAITING:
            state, news[pair] = GONE, LOST
        else:
            state = WAITING
        if state != GONE or absent < OPTIONS.memory:
            after[pair] = (state, absent)
    return after, news


def as_twin(book: LinkBook) -> Twin:
    rows = zip(book.target, book.source, book.state, book.absent, strict=True)
    return {(int(t), int(s)): (int(state), int(absent)) for t, s, state, absent in rows}


def is_sorted(table: LinkBook | LinkChanges) -> bool:
    keys = table.target.astype(np.int64) << 32 | table.source
    return bool(np.all(np.diff(keys) > 0))


@given(st.lists(night, min_size=2, max_size=7))
def test_book_and_changes_follow_the_rules(
    snapshot_of: Callable[..., Snapshot], played: list[tuple[set[Link], bool, set[int] | None]]
) -> None:
    lists = [{s: [t for t, u in links if u == s] for s in range(6)} for links, _, _ in played]
    book = start_book(snapshot_of(lists[0], 0))
    twin: Twin = dict.fromkeys(played[0][0], (SEEN, 0))
    for day, (links, degraded, fetched) in enumerate(played[1:], start=1):
        verdict = Verdict("repair" if degraded else "fine", ())
        snapshot = snapshot_of(lists[day], day, fetched=fetched)
        again = advance(book, snapshot, verdict, options=OPTIONS)
        book, changes, upkeep = advance(book, snapshot, verdict, options=OPTIONS)
        twin, news = twin_step(twin, links, degraded, fetched)

        assert as_twin(book) == twin
        rows = zip(changes.target, changes.source, changes.kind, strict=True)
        assert {(int(t), int(s)): int(kind) for t, s, kind in rows} == news
        assert is_sorted(book)
        assert is_sorted(changes)
        assert upkeep.new_links == sum(kind == NEW for kind in news.values())
        assert upkeep.carried_links == sum(state == CARRIED for state, _ in twin.values())
        assert not book.source.flags.writeable
        for ours, theirs in zip(vars(book).values(), vars(again[0]).values(), strict=True):
            if isinstance(ours, np.ndarray):
                assert ours.tobytes() == theirs.tobytes()


@given(st.sets(link, min_size=1), st.integers(1, 4))
def test_an_unchanged_snapshot_is_its_own_effective_snapshot(
    snapshot_of: Callable[..., Snapshot], links: set[Link], times: int
) -> None:
    lists = {s: [t for t, u in links if u == s] for s in range(6)}
    book = start_book(snapshot_of(lists, 0))
    for day in range(1, times + 1):
        book, changes, _ = advance(book, snapshot_of(lists, day), Verdict("fine", ()))
        assert len(changes.kind) == 0
    assert as_twin(book) == dict.fromkeys(links, (SEEN, 0))
