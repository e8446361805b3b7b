"""Planted events in a small world: each is raised as its kind, and nothing else is."""

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from swaygauge import detect
from swaygauge.records import Alert, Verdict

WATCHED = detect.Thresholds(watch_rank=300)
Maker = Callable[..., Any]


def kinds_of(alerts: tuple[Alert, ...], node: int) -> list[str]:
    return [alert.kind for alert in alerts if alert.node == node]


@pytest.mark.parametrize("seed", [11, 12])
def test_a_farm_is_a_surge_and_a_quiet_night_is_quiet(make_world: Maker, seed: int) -> None:
    world = make_world(seed, nights=10, churn=0.001, thresholds=WATCHED)
    quiet = [world.pass_night() for _ in range(20)]
    assert sum(alert.kind in ("surge", "drift") for night in quiet for alert in night) == 0
    assert sum(len(night) for night in quiet) <= 20
    target = world.at_rank(600)
    rank_before = world.rank()[target]
    alerts = world.pass_night(world.pack(world.fresh(40), target))
    assert alerts[0].kind == "surge"
    assert alerts[0].node == target
    assert alerts[0].direction == "rose"
    assert kinds_of(alerts, target) == ["surge"]  # told once
    facts = alerts[0].facts
    assert facts["new_links"] >= 40
    assert facts["expected_new"] < 2
    assert facts["scores"]["fairshare"]["rank_before"] == rank_before
    assert [alert.kind for alert in alerts].count("surge") == 1


def test_losing_most_endorsements_is_a_surge_downwards(make_world: Maker) -> None:
    world = make_world(13, nights=20, churn=0.001, thresholds=WATCHED)
    target = world.at_rank(4)
    endorsers = world.endorsers(target)
    alerts = world.pass_night(drop=world.pack(endorsers[2:], target))
    told = [alert for alert in alerts if alert.node == target]
    assert [(alert.kind, alert.direction) for alert in told] == [("surge", "fell")]
    assert told[0].facts["lost_links"] >= len(endorsers) - 3


def test_a_hub_that_drops_a_link_is_a_swing(make_world: Maker) -> None:
    world = make_world(14, nights=15, churn=0.0, thresholds=WATCHED)
    hub, leaf = world.at_rank(1), world.at_rank(900)
    world.links = world.links[(world.links >> 32) != hub]
    lone = [world.pack([hub], [leaf])]
    rise = world.pass_night(np.concatenate(lone))
    assert kinds_of(rise, leaf) == ["swing"]
    assert rise[0].direction == "rose"
    world.pass_night()
    fall = world.pass_night(drop=world.pack([hub], [leaf]))
    assert kinds_of(fall, leaf) == ["swing"]
    told = next(alert for alert in fall if alert.node == leaf)
    assert (told.direction, told.facts["lost_links"]) == ("fell", 1)
    assert told.size == pytest.approx(np.log2(told.rank_now / told.rank_before))


def test_one_more_endorser_deep_down_is_no_alert(make_world: Maker) -> None:
    world = make_world(15, nights=15, churn=0.0, thresholds=WATCHED)
    leaf = world.at_rank(1900)
    assert world.pass_night(world.pack(world.fresh(1), leaf)) == ()


def test_a_drip_is_a_drift_and_told_once(make_world: Maker) -> None:
    world = make_world(16, nights=20, churn=0.002, thresholds=WATCHED)
    target = world.at_rank(260)
    told = []
    for number in range(14):
        alerts = world.pass_night(world.pack(world.fresh(2), target))
        told += [(number, alert) for alert in alerts if alert.node == target]
    assert [alert.kind for _, alert in told] == ["drift"]  # the cooldown covers the rest
    number, alert = told[0]
    assert number <= 8
    assert alert.direction == "rose"
    assert alert.rank_before > alert.rank_now
    assert alert.size == pytest.approx(np.log2(alert.rank_before / alert.rank_now))
    assert alert.facts["window_new"] == pytest.approx(2 * alert.facts["window"], abs=2)
    assert alert.facts["window_expected"] < 0.2 * alert.facts["window_new"]


def test_a_slow_even_rise_is_told_of_by_drift_alone(make_world: Maker) -> None:
    # no night reaches the ratio of a swing: one more endorser of a well-endorsed node each night
    world = make_world(17, nights=20, churn=0.001, thresholds=WATCHED)
    target = world.at_rank(60)
    told = []
    for _ in range(20):
        alerts = world.pass_night(world.pack(world.fresh(1), target))
        told += [alert for alert in alerts if alert.node == target]
    assert told[0].kind == "drift"
    assert told[0].size >= np.log2(1.5)


def test_a_mass_arrival_at_the_top_is_one_line(make_world: Maker) -> None:
    world = make_world(18, nights=15, churn=0.0, thresholds=WATCHED)
    # sixty newcomers endorse each other: they push everybody down without touching anyone's own score
    members = world.fresh(60)
    pairs = np.array([(u, v) for u in members for v in members if u != v])
    alerts = world.pass_night(world.pack(pairs[:, 0], pairs[:, 1]))
    lines = [alert for alert in alerts if alert.kind == "displacement"]
    assert len(lines) == 1
    assert lines[0].direction == "fell"
    assert lines[0].facts["arrived"] == 60
    others = {alert.kind for alert in alerts if alert.node not in members.tolist()}
    assert others == {"displacement"}
    assert {alert.kind for alert in alerts if alert.node in members.tolist()} == {"arrival"}


def test_a_rename_is_proposed_once_and_its_departure_is_no_news(make_world: Maker) -> None:
    world = make_world(19, nights=15, churn=0.0, thresholds=WATCHED)
    old = world.at_rank(40)
    new = int(world.fresh(1)[0])
    touching = world.links[((world.links >> 32) == old) | ((world.links & 0xFFFFFFFF) == old)]
    source, target = touching >> 32, touching & 0xFFFFFFFF
    moved = world.pack(np.where(source == old, new, source), np.where(target == old, new, target))
    alerts = world.pass_night(moved, touching)
    assert [(alert.kind, alert.node) for alert in alerts] == [("rename", new)]
    facts = alerts[0].facts
    assert (facts["old"], facts["shared"]) == (old, facts["endorsers"])
    assert alerts[0].size == 1.0
    assert world.pass_night() == ()


def test_arrival_departure_and_return(make_world: Maker) -> None:
    world = make_world(20, nights=15, churn=0.0, thresholds=WATCHED)
    newcomer = int(world.fresh(1)[0])
    endorsers = np.array([world.at_rank(rank) for rank in range(40, 100)])
    links = world.pack(endorsers, newcomer)
    came = world.pass_night(links)
    assert ("arrival", newcomer) in [(alert.kind, alert.node) for alert in came]
    left = next(alert for alert in world.pass_night(drop=links) if alert.node == newcomer)
    assert (left.kind, left.direction, left.facts["judged"], left.rank_now) == ("departure", "left", True, 0)
    back = next(alert for alert in world.pass_night(links) if alert.node == newcomer)
    assert (back.kind, back.facts["returned"]) == ("arrival", True)


def test_short_history_speaks_of_large_swings_only(make_world: Maker) -> None:
    world = make_world(21, nights=4, churn=0.0, thresholds=WATCHED)
    target = world.at_rank(600)
    alerts = world.pass_night(world.pack(world.fresh(40), target))
    assert kinds_of(alerts, target) == ["swing"]
    assert all(alert.size >= 1.0 for alert in alerts if alert.kind == "swing")
    assert all(alert.facts["provisional"] for alert in alerts if alert.node >= 0)


def test_the_first_night_is_silent(make_world: Maker) -> None:
    world = make_world(22)
    assert world.pass_night() == ()
    assert world.state.seen.sum() > 1900


def test_a_coverage_step_says_so_and_nothing_about_nodes(make_world: Maker) -> None:
    world = make_world(23, nights=15, thresholds=WATCHED)
    counts = world.state.gains
    rise = Verdict(outcome="fine", results=(), coverage_step=True)
    alerts = world.pass_night(world.draw(9000), verdict=rise)
    assert [alert.kind for alert in alerts] == ["coverage_step"]
    assert world.state.gains.past[: len(counts.past)].tolist() == counts.past.tolist()
    assert all((sums.total == 0).all() for sums in world.state.drift.sums.values())


def test_a_watched_name_is_followed_at_any_place(make_world: Maker) -> None:
    world = make_world(24, nights=15, churn=0.0, thresholds=WATCHED)
    leaf = world.at_rank(1500)
    world.links = np.union1d(world.links, world.pack(world.fresh(6), leaf))
    inputs = world.show(Verdict(outcome="fine", results=()))
    silent, _ = detect.detect(inputs, world.state, WATCHED)
    told, _ = detect.detect(replace(inputs, watch_ids=np.array([leaf], np.int32)), world.state, WATCHED)
    assert kinds_of(silent, leaf) == []
    assert kinds_of(told, leaf) == ["surge"]
