"""Bad nights in a row on a living network: measure, judge, advance. They must neither flood nor blind.

A network of 600 sources, about 6,000 links, .3 % flicker, .3 % new and .2 % dropped links a night; the same nights are
played undisturbed and with a fault from night 10 on. Common practice, no source.
"""

from __future__ import annotations

import functools
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from datetime import date, timedelta

import numpy as np
import pytest

from swaygauge.checks.profile import measure
from swaygauge.checks.verdict import judge, rebaseline, rebaseline_due
from swaygauge.effective import advance, comparable_before, start_book
from swaygauge.records import LOST, NEW, LinkBook, LinkChanges, Origin, Profile, Snapshot

SOURCES, NODES, NIGHTS, FAULT = 600, 900, 30, 10
Fault = Callable[[np.ndarray, int], np.ndarray]


@pytest.fixture(scope="module")
def seen() -> list[np.ndarray]:
    """(target << 32 | source) of every night as crawled, flicker included."""
    rng = np.random.default_rng(17)

    def draw(count: int) -> np.ndarray:
        source = np.minimum(rng.pareto(1.0, count) * 40, SOURCES - 1).astype(np.int64)
        return (rng.integers(0, NODES, count) << 32) | source

    real = np.unique(draw(9000))
    nights = []
    for _ in range(NIGHTS):
        real = np.union1d(real[rng.random(len(real)) > 0.002], draw(round(0.003 * len(real))))
        nights.append(real[rng.random(len(real)) > 0.003])
    return nights


@dataclass
class Played:
    outcomes: list[str] = field(default_factory=list)
    lost: set[tuple[int, int]] = field(default_factory=set)  # losses that may be alerted
    new: set[tuple[int, int]] = field(default_factory=set)  # gains that may be alerted
    departed: int = 0
    baselines: list[int] = field(default_factory=list)
    compared_apart: list[int] = field(default_factory=list)  # nights on which yesterday was adjusted
    book: LinkBook | None = None


def play(seen: list[np.ndarray], fault: Fault | None = None) -> Played:
    out = Played()
    book: LinkBook | None = None
    trailing: list[Profile] = []
    fine: list[Profile] = []
    held: list[Snapshot] = []
    for day, keys in enumerate(seen):
        keys = fault(keys, day) if fault else keys
        source, target = (keys & 0xFFFFFFFF).astype(np.int32), (keys >> 32).astype(np.int32)
        origin = Origin("made", "0" * 64, 1, "csv", len(keys))
        raw = Snapshot(date(2030, 1, 1) + timedelta(days=day), source, target, None, origin)
        profile = measure(raw, book, trailing=trailing)
        verdict = judge(profile, fine_nights=fine)
        if verdict.outcome == "hold" and rebaseline_due(verdict, held, raw):
            verdict = rebaseline(verdict)
            out.baselines.append(day)
        out.outcomes.append(verdict.outcome)
        if verdict.outcome == "hold":
            held.append(raw)
            continue
        held.clear()
        trailing = [] if verdict.starts_baseline else trailing
        trailing.append(profile)
        if verdict.outcome == "fine":
            fine.append(profile)
        if book is None:
            book = start_book(raw)
            continue
        before = book
        book, changes, upkeep = advance(before, raw, verdict)
        if comparable_before(before, changes) is not None:
            out.compared_apart.append(day)
        counted = ~changes.coverage & (not verdict.starts_baseline)
        out.lost |= pairs(changes, counted & (changes.kind == LOST))
        out.new |= pairs(changes, counted & (changes.kind == NEW))
        out.departed += len(upkeep.departed)
    out.book = book
    return out


def pairs(table: LinkBook | LinkChanges, rows: np.ndarray) -> set[tuple[int, int]]:
    return set(zip(table.source[rows].tolist(), table.target[rows].tolist(), strict=True))


def partial(share: float, last: int) -> Fault:
    missing = np.random.default_rng(3).random(SOURCES) < share
    return lambda keys, day: keys[~missing[keys & 0xFFFFFFFF]] if FAULT <= day <= last else keys


def capped(longest: int, last: int) -> Fault:
    def cut(keys: np.ndarray, day: int) -> np.ndarray:
        if not FAULT <= day <= last:
            return keys
        source = keys & 0xFFFFFFFF
        order = np.argsort(source, kind="stable")
        place = np.arange(len(keys)) - np.searchsorted(source[order], source[order])
        return np.sort(keys[order[place < longest]])

    return cut


@pytest.fixture(scope="module")
def played(seen: list[np.ndarray], plain_rules) -> Iterator[Callable[..., Played]]:
    """Plays each fault once."""
    kinds = {"partial": partial, "capped": capped}
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("swaygauge.checks.verdict.run_rules", plain_rules)  # thirty nights, ten times over
        yield functools.cache(lambda kind=None, *how: play(seen, kinds[kind](*how) if kind else None))


FAULTS = [
    *(("partial", share, last) for share in (0.1, 0.4) for last in (14, 21, NIGHTS)),
    *(("capped", 25, last) for last in (14, 21, NIGHTS)),
    ("partial", 0.7, 21),
]


def test_undisturbed_nights_are_fine(played) -> None:
    quiet = played()
    assert quiet.outcomes == ["fine"] * NIGHTS
    assert quiet.compared_apart == []
    assert quiet.departed == 0


@pytest.mark.parametrize("fault", FAULTS[:-1])
def test_faults_are_repaired_and_no_departure_is_inferred(played, fault) -> None:
    outcomes = played(*fault).outcomes
    assert set(outcomes) == {"fine", "repair"}
    assert outcomes[FAULT] == "repair"
    # Lists that stay capped keep looking cut; sources that stay away are forgotten.
    assert outcomes[-1] == ("repair" if fault == ("capped", 25, NIGHTS) else "fine")
    assert played(*fault).departed == 0


@pytest.mark.parametrize("fault", FAULTS)
def test_no_loss_is_invented(played, fault) -> None:
    """Losses met while sources were dark come out together afterwards, but none that did not happen."""
    quiet, ours = played(), played(*fault)
    assert len(ours.lost) > 0.4 * len(quiet.lost)
    assert ours.lost <= quiet.lost


@pytest.mark.parametrize("fault", FAULTS)
def test_no_gain_is_invented(played, fault) -> None:
    quiet, ours = played(), played(*fault)
    assert len(ours.new) > 0.4 * len(quiet.new)
    assert ours.new <= quiet.new


@pytest.mark.parametrize("share", [0.1, 0.4])
def test_carried_links_end_and_come_back_together(played, share: float) -> None:
    assert played("partial", share, 14).compared_apart == []
    end = FAULT + 7
    flickered = {end - 1}  # links that were missing on the night before already end a night earlier
    assert {end} == set(played("partial", share, NIGHTS).compared_apart) - flickered
    assert {end, 22} == set(played("partial", share, 21).compared_apart) - flickered


def test_seventy_percent_missing_is_held_and_then_the_new_baseline(played) -> None:
    ours = played("partial", 0.7, 21)
    assert ours.outcomes[FAULT : FAULT + 3] == ["hold", "hold", "fine"]
    assert ours.baselines == [FAULT + 2]
    assert "hold" not in ours.outcomes[FAULT + 3 :]
    assert ours.compared_apart == [22]


@pytest.mark.parametrize("fault", [fault for fault in FAULTS if fault[2] < NIGHTS])
def test_after_everything_is_back_the_same_links_are_in_effect(played, fault) -> None:
    ours, quiet = played(*fault).book, played().book
    assert pairs(ours, ours.in_effect) == pairs(quiet, quiet.in_effect)
