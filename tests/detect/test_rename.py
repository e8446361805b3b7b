"""Renames seen through links that are still waiting, and pairs that only look like one."""

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from swaygauge import detect
from swaygauge.records import NEW, SEEN, WAITING, LinkBook, LinkChanges, Verdict

Maker = Callable[..., Any]
WATCHED = detect.Thresholds(watch_rank=300)
FINE = Verdict("fine", ())


def moved_on(world: Any, old: int, keep: int = 0) -> tuple[detect.NightInputs, int]:
    """Everyone but ``keep`` endorsers of a node endorses a new one instead; the old links wait for one more night."""
    endorsers = world.endorsers(old)
    new = int(world.fresh(1)[0])
    world.links = np.union1d(world.links, world.pack(endorsers[keep:], new))
    inputs = world.show(FINE)
    book = inputs.book
    assert book is not None
    waiting = (book.target == old) & np.isin(book.source, endorsers[keep:])
    state = np.where(waiting, WAITING, SEEN).astype(np.uint8)
    late = LinkBook(book.night, book.source, book.target, None, state, waiting.astype(np.uint8))
    return replace(inputs, book=late), new


def test_a_rename_is_seen_while_the_old_links_still_wait(make_world: Maker) -> None:
    world = make_world(51, nights=10, churn=0.0, thresholds=WATCHED)
    old = world.at_rank(30)
    endorsed = len(world.endorsers(old))
    inputs, new = moved_on(world, old)
    alerts, state = detect.detect(inputs, world.state, WATCHED)
    assert [(alert.kind, alert.node) for alert in alerts if alert.kind != "swing"] == [("rename", new)]
    facts = alerts[0].facts
    assert (facts["old"], facts["shared"], facts["endorsers"]) == (old, endorsed, endorsed)
    assert state.renamed.tolist() == [old]


@pytest.mark.parametrize(("stay", "proposed"), [(0.1, True), (0.3, False)])
def test_an_old_name_that_keeps_its_endorsers_is_not_renamed(make_world: Maker, stay: float, proposed: bool) -> None:
    world = make_world(52, nights=10, churn=0.0, thresholds=WATCHED)
    old = world.at_rank(10)
    inputs, _ = moved_on(world, old, keep=int(stay * len(world.endorsers(old))))
    alerts, _ = detect.detect(inputs, world.state, WATCHED)
    assert ("rename" in [alert.kind for alert in alerts]) is proposed


def test_two_newcomers_cannot_both_be_the_old_one(make_world: Maker) -> None:
    world = make_world(53, nights=10, churn=0.0, thresholds=WATCHED)
    old = world.at_rank(20)
    endorsers = world.endorsers(old)
    first, second = world.fresh(2)
    gone = world.pack(endorsers, old)
    added = np.concatenate((world.pack(endorsers, first), world.pack(endorsers[:-1], second)))
    alerts = world.pass_night(added, gone)
    renames = [alert for alert in alerts if alert.kind == "rename"]
    assert [(alert.node, alert.facts["old"]) for alert in renames] == [(int(first), old)]


def test_overlap_is_jaccards(make_world: Maker) -> None:
    world = make_world(54, nights=10, churn=0.0, thresholds=WATCHED)
    old = world.at_rank(15)
    endorsers = set(world.endorsers(old).tolist())
    others = set(range(1500, 1506)) - endorsers
    new = int(world.fresh(1)[0])
    followers = np.array(sorted(list(endorsers)[5:] + list(others)))
    gone = world.pack(sorted(endorsers), old)
    alerts = world.pass_night(world.pack(followers, new), gone)
    rename = next(alert for alert in alerts if alert.kind == "rename")
    exact = len(endorsers & set(followers.tolist())) / len(endorsers | set(followers.tolist()))
    assert rename.size == pytest.approx(exact)


def test_new_endorsements_of_the_leaving_node_are_not_what_it_had(make_world: Maker) -> None:
    world = make_world(55, nights=10, churn=0.0, thresholds=WATCHED)
    old = world.at_rank(30)
    inputs, new = moved_on(world, old)
    extra = np.setdiff1d(np.arange(100, 160), world.endorsers(old)).astype(np.int32)
    assert inputs.book is not None
    assert inputs.changes is not None
    fresh = np.full(len(extra), old, np.int32)
    book = LinkBook(
        inputs.night,
        np.concatenate((inputs.book.source, extra)),
        np.concatenate((inputs.book.target, fresh)),
        None,
        np.concatenate((inputs.book.state, np.zeros(len(extra), np.uint8))),
        np.concatenate((inputs.book.absent, np.zeros(len(extra), np.uint8))),
    )
    more = LinkChanges(
        np.concatenate((inputs.changes.source, extra)),
        np.concatenate((inputs.changes.target, fresh)),
        np.concatenate((inputs.changes.kind, np.full(len(extra), NEW, np.uint8))),
        np.concatenate((inputs.changes.before, np.zeros(len(extra)))),
        np.concatenate((inputs.changes.after, np.ones(len(extra)))),
        np.concatenate((inputs.changes.coverage, np.zeros(len(extra), np.bool_))),
    )
    alerts, _ = detect.detect(replace(inputs, book=book, changes=more), world.state, WATCHED)
    rename = next(alert for alert in alerts if alert.kind == "rename")
    assert (rename.node, rename.size) == (new, 1.0)
