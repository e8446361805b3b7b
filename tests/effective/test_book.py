"""The book of links over several nights: debounced, carried, expired, returned. Common practice, no source."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date

import numpy as np
import pytest

from swaygauge.effective import UpkeepOptions, advance, start_book
from swaygauge.errors import InputError, UnclearNight
from swaygauge.records import (
    CARRIED,
    EXPIRED,
    GONE,
    LOST,
    NEW,
    RETURNED,
    REWEIGHTED,
    SEEN,
    SHELVED,
    WAITING,
    LinkBook,
    LinkChanges,
    Snapshot,
    Upkeep,
    Verdict,
)

Lists = dict[int, list[int]]

FINE = Verdict("fine", ())
DEGRADED = Verdict("repair", ())
CAPPED = Verdict("repair", (), capped=True)

NAMES = {NEW: "new", RETURNED: "returned", LOST: "lost", REWEIGHTED: "reweighted", EXPIRED: "expired"}


class Nights:
    """Plays nights one after the other and keeps what came out."""

    def __init__(self, snapshot_of: Callable[..., Snapshot], first: Lists, options: UpkeepOptions | None = None):
        self.snapshot_of = snapshot_of
        self.options = options
        self.day = 0
        self.book: LinkBook = start_book(snapshot_of(first, 0))
        self.changes: LinkChanges
        self.upkeep: Upkeep

    def play(self, lists: Lists, verdict: Verdict = FINE, times: int = 1, fetched: list[int] | None = None) -> None:
        for _ in range(times):
            self.day += 1
            snapshot = self.snapshot_of(lists, self.day, fetched=fetched)
            self.book, self.changes, self.upkeep = advance(self.book, snapshot, verdict, options=self.options)

    def state(self, source: int, target: int) -> int | None:
        row = np.flatnonzero((self.book.source == source) & (self.book.target == target))
        return int(self.book.state[row[0]]) if len(row) else None

    @property
    def news(self) -> list[tuple[int, int, str]]:
        c = self.changes
        return [(int(s), int(t), NAMES[int(k)]) for s, t, k in zip(c.source, c.target, c.kind, strict=True)]


@pytest.fixture
def nights(snapshot_of: Callable[..., Snapshot]) -> Callable[..., Nights]:
    return lambda first, options=None: Nights(snapshot_of, first, options)


TOWN: Lists = {0: [10, 11, 12], 1: [10, 11], 2: [12, 13, 14]}


def test_first_night_is_scored_as_it_is(nights) -> None:
    n = nights(TOWN)
    assert n.book.in_effect.all()
    assert n.book.absent.max() == 0


def test_unchanged_snapshot_changes_nothing(nights) -> None:
    n = nights(TOWN)
    first = n.book
    n.play(TOWN)
    assert n.news == []
    assert np.array_equal(n.book.source, first.source)
    assert np.array_equal(n.book.state, first.state)


LESS = {**TOWN, 0: [10, 11]}


class TestDebounce:
    def test_missing_once_stands(self, nights) -> None:
        n = nights(TOWN)
        n.play(LESS)
        assert n.state(0, 12) == WAITING
        assert n.news == []
        assert n.upkeep.waiting_links == 1
        n.play(TOWN)
        assert n.state(0, 12) == SEEN
        assert n.news == []

    def test_missing_twice_is_lost(self, nights) -> None:
        n = nights(TOWN)
        n.play(LESS, times=2)
        assert n.news == [(0, 12, "lost")]
        assert n.state(0, 12) == GONE

    def test_can_be_switched_off(self, nights) -> None:
        n = nights(TOWN, UpkeepOptions(debounce=0))
        n.play(LESS)
        assert n.news == [(0, 12, "lost")]

    def test_an_unfetched_night_is_no_second_look(self, nights) -> None:
        n = nights(TOWN)
        n.play(LESS)
        n.play({1: TOWN[1], 2: TOWN[2]}, times=3)
        assert n.state(0, 12) == WAITING
        assert n.state(0, 11) == CARRIED
        n.play(LESS)
        assert n.news == [(0, 12, "lost")]

    def test_flicker_after_an_unfetched_spell_is_debounced_too(self, nights) -> None:
        n = nights(TOWN)
        n.play({1: TOWN[1], 2: TOWN[2]}, times=3)
        n.play(LESS)
        assert n.state(0, 12) == WAITING
        n.play(TOWN)
        assert n.news == []


def test_new_links_count_at_once(nights) -> None:
    n = nights(TOWN)
    n.play({**TOWN, 3: [10], 1: [10, 11, 14]})
    assert n.news == [(3, 10, "new"), (1, 14, "new")]


GAP = {1: TOWN[1], 2: TOWN[2]}


class TestCarrying:
    def test_for_seven_nights_and_no_longer(self, nights) -> None:
        n = nights(TOWN)
        for _ in range(7):
            n.play(GAP)
            assert n.news == []
            assert (n.upkeep.carried_links, n.upkeep.carried_sources) == (3, 1)
            assert n.upkeep.unfetched.tolist() == [0]
        n.play(GAP)
        assert n.news == [(0, 10, "expired"), (0, 11, "expired"), (0, 12, "expired")]
        assert n.upkeep.expired_links == 3
        assert n.upkeep.lost_links == 0
        n.play(GAP)
        assert n.news == []

    def test_new_links_of_the_returning_source_count_and_the_carried_ones_are_no_news(self, nights) -> None:
        n = nights(TOWN)
        n.play(GAP, times=5)
        n.play({**TOWN, 0: [10, 11, 12, 15]})
        assert n.news == [(0, 15, "new")]

    def test_carry_nights_is_an_option(self, nights) -> None:
        n = nights(TOWN, UpkeepOptions(carry_nights=0))
        n.play(GAP)
        assert {kind for _, _, kind in n.news} == {"expired"}


class TestReturn:
    def play_loss_of(self, n: Nights, absent_nights: int) -> None:
        n.play({**TOWN, 0: [10, 11]}, times=absent_nights)

    @pytest.mark.parametrize(("absent_nights", "kind"), [(2, "returned"), (29, "returned"), (30, "new")])
    def test_within_thirty_nights_is_not_new(self, nights, absent_nights: int, kind: str) -> None:
        n = nights(TOWN)
        self.play_loss_of(n, absent_nights)
        n.play(TOWN)
        # Last seen on night 0: on night 30 it is 30 nights ago, on night 31 too long.
        assert n.news == [(0, 12, kind)]

    def test_the_book_forgets(self, nights) -> None:
        n = nights(TOWN)
        self.play_loss_of(n, 29)
        assert n.state(0, 12) == GONE
        self.play_loss_of(n, 1)
        assert n.state(0, 12) is None


class TestDegraded:
    """Sources 0 .. 59 endorse three nodes each; every third has one link only."""

    def lists(self) -> Lists:
        return {s: [100 + s % 7] if s % 3 == 0 else [100 + s % 7, 110 + s % 5, (s + 1) % 60] for s in range(60)}

    @pytest.mark.parametrize("share", [0.1, 0.4])
    def test_partial_crawl_changes_nothing(self, nights, share: float) -> None:
        lists = self.lists()
        n = nights(lists)
        missing = np.random.default_rng(5).permutation(60)[: int(60 * share)].tolist()
        n.play({s: ts for s, ts in lists.items() if s not in missing}, DEGRADED)
        assert n.news == []
        assert n.upkeep.departed.tolist() == []
        assert n.upkeep.unfetched.tolist() == sorted(missing)
        assert n.upkeep.carried_sources == len(missing)
        n.play(lists)
        assert n.news == []

    def test_the_same_crawl_called_fine_would_lose_links(self, nights) -> None:
        """The contrast that makes the test above able to fail."""
        lists = self.lists()
        n = nights(lists)
        part = {s: ts for s, ts in lists.items() if s % 3}  # the one-link sources are missing
        n.play(part, times=2)
        assert n.upkeep.lost_links == 20


class TestCapped:
    def lists(self, longest: int) -> Lists:
        return {s: list(range(100, 100 + longest)) for s in range(8)} | {20: [1, 2], 21: [1, 3]}

    def test_cut_lists_are_carried_and_their_new_links_count(self, nights) -> None:
        n = nights(self.lists(12))
        cut = self.lists(10)
        cut[3] = [*cut[3][:9], 200]
        n.play(cut, CAPPED, times=3)
        assert n.upkeep.carried_links == 8 * 2 + 1
        assert n.upkeep.lost_links == 0
        assert n.state(3, 200) == SEEN
        n.play(self.lists(12))
        assert n.news == []
        assert n.state(3, 200) == WAITING

    def test_shrunk_lists_are_carried_too(self, nights) -> None:
        n = nights(self.lists(12))
        less = self.lists(12)
        less[5] = less[5][:9]  # a quarter less; the longest list stays 12
        n.play(less, CAPPED)
        assert n.upkeep.carried_links == 3

    def test_other_losses_are_debounced_as_usual(self, nights) -> None:
        n = nights(self.lists(12))
        less = self.lists(10)
        less[20] = [1]
        n.play(less, CAPPED, times=2)
        assert n.state(20, 2) == GONE

    def test_not_capped_means_losses_count(self, nights) -> None:
        n = nights(self.lists(12))
        n.play(self.lists(10), DEGRADED, times=2)
        assert n.upkeep.lost_links == 8 * 2


WEIGHED = {0: {10: 2.0, 11: 1.0}, 1: {10: 4.0, 12: 1.0}}


class TestWeights:
    def test_another_weight_is_a_change_and_a_carried_link_keeps_its_last(self, nights) -> None:
        n = nights(WEIGHED)
        n.play({1: {10: 5.0, 12: 1.0}})
        assert n.news == [(1, 10, "reweighted")]
        assert (n.changes.before.tolist(), n.changes.after.tolist()) == ([4.0], [5.0])
        assert n.book.weight.tolist() == [2.0, 5.0, 1.0, 1.0]

    def test_lost_new_and_returned_weights(self, nights) -> None:
        n = nights(WEIGHED)
        without = {0: {10: 2.0}, 1: {10: 4.0, 12: 1.0, 13: 7.0}}
        n.play(without)
        assert (n.news, n.changes.before.tolist(), n.changes.after.tolist()) == ([(1, 13, "new")], [0.0], [7.0])
        n.play(without)
        assert (n.news, n.changes.before.tolist(), n.changes.after.tolist()) == ([(0, 11, "lost")], [1.0], [0.0])
        n.play({0: {10: 2.0, 11: 3.0}, 1: without[1]})
        assert (n.news, n.changes.before.tolist(), n.changes.after.tolist()) == ([(0, 11, "returned")], [0.0], [3.0])

    def test_unweighted_links_weigh_one(self, nights) -> None:
        n = nights(TOWN)
        n.play({**TOWN, 3: [10]})
        assert (n.changes.before.tolist(), n.changes.after.tolist()) == ([0.0], [1.0])


AFTER = {0: [10, 11], 5: [30, 31]}


class TestBaseline:
    def test_stands_alone_and_shelves_the_rest(self, nights) -> None:
        n = nights(TOWN)
        n.play(AFTER, Verdict("fine", (), rebaselined=True))
        assert np.flatnonzero(n.book.in_effect).size == 4
        assert n.state(2, 12) == SHELVED
        assert n.upkeep.coverage_step
        assert n.upkeep.unfetched.tolist() == []
        assert n.upkeep.lost_links == 6

    def test_the_shelved_are_remembered_without_end(self, nights) -> None:
        n = nights(TOWN)
        n.play(AFTER, Verdict("fine", (), rebaselined=True))
        n.play(AFTER, times=300)
        assert n.state(2, 12) == SHELVED
        n.play({**AFTER, 2: [12]})
        assert n.news == [(2, 12, "returned")]


class TestRefused:
    def test_nights_go_forward(self, snapshot_of) -> None:
        book = start_book(snapshot_of(TOWN, 5))
        with pytest.raises(UnclearNight, match="2030-01-06 is not later than 2030-01-06"):
            advance(book, snapshot_of(TOWN, 5), FINE)

    def test_a_held_night_takes_no_effect(self, snapshot_of) -> None:
        with pytest.raises(InputError, match="was held"):
            advance(start_book(snapshot_of(TOWN, 0)), snapshot_of(TOWN, 1), Verdict("hold", ()))

    def test_weights_on_one_side_only(self, snapshot_of) -> None:
        book = start_book(snapshot_of(TOWN, 0))
        with pytest.raises(InputError, match="2030-01-02 has weights, but the nights up to 2030-01-01 had none"):
            advance(book, snapshot_of({0: {10: 1.0}}, 1), FINE)


def test_a_gap_of_nights_counts_as_one_step(snapshot_of) -> None:
    book = start_book(snapshot_of(TOWN, 0))
    book, changes, _ = advance(book, snapshot_of({**TOWN, 0: [10, 11]}, 9), FINE)
    assert len(changes.kind) == 0
    assert book.night == date(2030, 1, 10)
    assert sorted(book.absent.tolist()) == [0] * 7 + [1]
