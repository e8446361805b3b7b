"""Departed or not fetched: what an empty source tells. Rules of the trade, common practice, no source."""

from __future__ import annotations

from collections.abc import Callable

import pytest

from swaygauge.effective import UpkeepOptions, advance, start_book
from swaygauge.records import Snapshot, Upkeep, Verdict

Lists = dict[int, list[int]]

FINE = Verdict("fine", ())
DEGRADED = Verdict("repair", ())

# Node 0 endorses 20, 21 and is endorsed by 1 .. 5, each of which endorses others as well.
VILLAGE: Lists = {0: [20, 21], **{source: [0, 20 + source, 30] for source in range(1, 6)}}


@pytest.fixture
def upkeep(snapshot_of: Callable[..., Snapshot]) -> Callable[..., Upkeep]:
    def run(before: Lists, tonight: Lists, verdict: Verdict = FINE, fetched: list[int] | None = None) -> Upkeep:
        return advance(start_book(snapshot_of(before, 0)), snapshot_of(tonight, 1, fetched=fetched), verdict)[2]

    return run


def without(lists: Lists, gone: int, endorsers: int) -> Lists:
    """``gone`` endorses nobody any more, and the first ``endorsers`` no longer endorse it."""
    return {s: [t for t in ts if not (t == gone and s <= endorsers)] for s, ts in lists.items() if s != gone}


@pytest.mark.parametrize(
    ("endorsers", "departed"), [(5, True), (4, True), (3, False), (0, False)], ids=["all", "80 %", "60 %", "none"]
)
def test_empty_source_departed_when_its_endorsers_left_too(upkeep, endorsers: int, departed: bool) -> None:
    kept = upkeep(VILLAGE, without(VILLAGE, 0, endorsers))
    assert (kept.departed.tolist() == [0]) is departed
    assert (kept.unfetched.tolist() == [0]) is not departed


def test_fewer_than_three_endorsers_say_nothing(upkeep) -> None:
    village = {0: [20, 21], 1: [0, 30], 2: [0, 30]}
    assert upkeep(village, without(village, 0, 2)).unfetched.tolist() == [0]
    village[3] = [0, 30]
    assert upkeep(village, without(village, 0, 3)).departed.tolist() == [0]


def test_one_link_says_nothing_on_a_fine_night_and_is_carried_on_a_degraded_one(upkeep) -> None:
    village = {0: [20], 1: [20, 21]}
    fine = upkeep(village, {1: [20, 21]})
    assert (fine.unfetched.tolist(), fine.carried_links, fine.waiting_links) == ([], 0, 1)
    degraded = upkeep(village, {1: [20, 21]}, DEGRADED)
    assert (degraded.unfetched.tolist(), degraded.carried_links, degraded.waiting_links) == ([0], 1, 0)


def test_no_departure_on_a_degraded_night(upkeep) -> None:
    tonight = without(VILLAGE, 0, 5)
    assert upkeep(VILLAGE, tonight).departed.tolist() == [0]
    kept = upkeep(VILLAGE, tonight, DEGRADED)
    assert (kept.departed.tolist(), kept.unfetched.tolist()) == ([], [0])


def test_a_host_that_is_down_takes_its_club_with_it_but_nobody_departed(upkeep) -> None:
    # Six sites of one host endorse each other and nobody else does; the host does not answer.
    club = {source: [target for target in range(6) if target != source] for source in range(6)}
    others = {10: [20, 21], 11: [20, 22]}
    kept = upkeep({**club, **others}, others)
    assert kept.departed.tolist() == []
    assert kept.unfetched.tolist() == list(range(6))
    assert kept.carried_links == 30


def test_links_to_and_from_a_departed_node_go_at_once(upkeep) -> None:
    kept = upkeep(VILLAGE, without(VILLAGE, 0, 4))
    assert (kept.lost_links, kept.waiting_links, kept.carried_links) == (2 + 4, 0, 0)


TRIO: Lists = {0: [20, 21], 1: [20, 22], 2: [20]}


class TestFetchList:
    """Crawled with links, crawled empty, not crawled: the list decides."""

    def test_not_crawled_is_carried_even_with_one_link(self, upkeep) -> None:
        kept = upkeep(TRIO, {0: [20, 21]}, fetched=[0])
        assert kept.unfetched.tolist() == [1, 2]
        assert (kept.carried_links, kept.waiting_links) == (3, 0)

    def test_crawled_empty_is_a_loss_and_only_debounced(self, upkeep) -> None:
        kept = upkeep(TRIO, {0: [20, 21]}, fetched=[0, 1, 2])
        assert kept.unfetched.tolist() == []
        assert (kept.carried_links, kept.waiting_links) == (0, 3)

    def test_crawled_empty_and_deserted_is_departed(self, upkeep) -> None:
        tonight = without(VILLAGE, 0, 5)
        assert upkeep(VILLAGE, tonight, fetched=list(range(6))).departed.tolist() == [0]

    def test_not_crawled_is_never_departed(self, upkeep) -> None:
        tonight = without(VILLAGE, 0, 5)
        kept = upkeep(VILLAGE, tonight, fetched=[1, 2, 3, 4, 5])
        assert (kept.departed.tolist(), kept.unfetched.tolist()) == ([], [0])

    def test_endorsers_that_were_not_crawled_are_no_evidence(self, upkeep) -> None:
        kept = upkeep(VILLAGE, {9: [8]}, fetched=[0, 9])
        assert kept.departed.tolist() == []
        assert kept.unfetched.tolist() == [1, 2, 3, 4, 5]


def test_options_move_the_limits(snapshot_of: Callable[..., Snapshot]) -> None:
    book = start_book(snapshot_of(VILLAGE, 0))
    tonight = snapshot_of(without(VILLAGE, 0, 3), 1)
    assert advance(book, tonight, FINE)[2].departed.tolist() == []
    assert advance(book, tonight, FINE, options=UpkeepOptions(departed_loss=0.6))[2].departed.tolist() == [0]
    strict = UpkeepOptions(departed_loss=0.6, departed_links=6)
    assert advance(book, tonight, FINE, options=strict)[2].departed.tolist() == []
