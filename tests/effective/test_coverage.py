"""Coverage changes are set aside and last night is compared like with like. Limits: common practice, no source."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from swaygauge.effective import UpkeepOptions, advance, comparable_before, start_book
from swaygauge.records import EXPIRED, LinkBook, LinkChanges, Snapshot, Verdict

Lists = dict[int, list[int]]

FINE = Verdict("fine", ())
DEGRADED = Verdict("repair", ())
QUICK = UpkeepOptions(carry_nights=0)


def town(sources: int = 400) -> Lists:
    """400 sources with five links each: 2,000 links."""
    return {s: [1000 + (7 * s + i) % 300 for i in range(5)] for s in range(sources)}


def without(lists: Lists, sources: range) -> Lists:
    return {s: ts for s, ts in lists.items() if s not in sources}


def in_effect(book: LinkBook) -> set[tuple[int, int]]:
    on = book.in_effect
    return set(zip(book.source[on].tolist(), book.target[on].tolist(), strict=True))


@pytest.fixture
def play(snapshot_of: Callable[..., Snapshot]) -> Callable[..., tuple[LinkBook, LinkBook, LinkChanges]]:
    def run(*nights: Lists, verdict: Verdict = DEGRADED, options: UpkeepOptions = QUICK):
        book = start_book(snapshot_of(nights[0], 0))
        for day, lists in enumerate(nights[1:], start=1):
            before = book
            book, changes, _ = advance(before, snapshot_of(lists, day), verdict, options=options)
        return before, book, changes

    return run


@pytest.mark.parametrize(("sources", "is_coverage"), [(4, False), (5, True)])
def test_links_that_expire_together(play, sources: int, is_coverage: bool) -> None:
    before, after, changes = play(town(), without(town(), range(sources)), verdict=FINE)
    assert len(changes.kind) == 5 * sources
    assert changes.coverage.all() == is_coverage
    compared = comparable_before(before, changes)
    if is_coverage:
        assert compared is not None
        assert in_effect(compared) == in_effect(after)
    else:
        assert compared is None


@pytest.mark.parametrize(("share", "is_coverage"), [(0.0125, False), (0.0124, True)])
def test_expiry_needs_more_than_its_share(play, share: float, is_coverage: bool) -> None:
    options = UpkeepOptions(carry_nights=0, expiry_share=share)
    changes = play(town(), without(town(), range(5)), verdict=FINE, options=options)[2]
    assert changes.coverage.any() == is_coverage


@pytest.mark.parametrize(("sources", "is_coverage"), [(2, False), (3, True)])
def test_known_links_that_come_back(play, sources: int, is_coverage: bool) -> None:
    """Ten of 2,000 links are .5 %, fifteen are more."""
    before, after, changes = play(town(), without(town(), range(sources)), town(), verdict=FINE)
    assert len(changes.kind) == 5 * sources
    assert changes.coverage.all() == is_coverage
    if is_coverage:
        compared = comparable_before(before, changes)
        assert compared is not None
        assert in_effect(compared) == in_effect(after)


def test_where_lists_are_capped_few_links_that_expire_or_come_back_are_coverage_too(play) -> None:
    capped = Verdict("repair", (), capped=True)
    expired = play(town(), without(town(), range(1)), verdict=capped)[2]
    returned = play(town(), without(town(), range(1)), town(), verdict=capped)[2]
    for changes in (expired, returned):
        assert len(changes.kind) == 5
        assert changes.coverage.all()


def test_what_else_returning_sources_show_is_coverage_but_not_the_news_of_others(play) -> None:
    back = town()
    back[0] = [*back[0], 2000]  # five of six added links are known
    back[1] = [*back[1][:2], *range(2001, 2004)]  # two of five: mostly new
    back[399] = [*back[399], 2005]  # was never away
    before, after, changes = play(town(), without(town(), range(10)), back)
    pairs = list(zip(changes.source.tolist(), changes.target.tolist(), strict=True))
    aside = {pair for pair, flag in zip(pairs, changes.coverage, strict=True) if flag}
    assert (0, 2000) in aside
    assert {(1, 2001), (1, 2002), (1, 2003), (399, 2005)} == set(pairs) - aside
    compared = comparable_before(before, changes)
    assert compared is not None
    assert in_effect(after) - in_effect(compared) == set(pairs) - aside
    keys = compared.target.astype(np.int64) << 32 | compared.source
    assert np.all(np.diff(keys) > 0)


def test_returning_links_come_into_yesterday_with_tonights_weight(snapshot_of) -> None:
    heavy = {s: dict.fromkeys(ts, 2.0) for s, ts in town().items()}
    book = start_book(snapshot_of(heavy, 0))
    book, _, _ = advance(book, snapshot_of(without(heavy, range(5)), 1), DEGRADED, options=QUICK)
    heavy[0] = dict.fromkeys(heavy[0], 3.0)
    _, changes, upkeep = advance(book, snapshot_of(heavy, 2), FINE, options=QUICK)
    compared = comparable_before(book, changes)
    assert compared is not None
    assert compared.weight is not None
    assert set(compared.weight[compared.source == 0]) == {3.0}
    assert upkeep.coverage_links == 25


def test_expired_and_lost_are_told_apart(play) -> None:
    tonight = without(town(), range(5))
    tonight[10] = tonight[10][:4]
    options = UpkeepOptions(carry_nights=0, debounce=0)
    _, _, changes = play(town(), tonight, options=options)
    assert changes.coverage.tolist() == (changes.kind == EXPIRED).tolist()
    assert np.count_nonzero(~changes.coverage) == 1


def test_a_new_baseline_is_not_compared_at_all(play) -> None:
    _, _, changes = play(town(), without(town(), range(300)), verdict=Verdict("fine", (), rebaselined=True))
    assert not changes.coverage.any()
