"""The ratio that makes a swing keeps to a budget; drift hears what a smaller limit said too early."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from swaygauge import detect
from swaygauge.detect import drift
from swaygauge.detect.swings import after_night, choose_ratio
from swaygauge.detect.thresholds import Drift, Swing

OPTIONS = Swing(ratio=1.5, raised=(2.0, 4.0), budget=3.0)


def test_the_smallest_ratio_within_the_budget_is_used() -> None:
    assert choose_ratio(np.array([[3, 1, 0]] * 5), OPTIONS) == 1.5
    assert choose_ratio(np.array([[4, 3, 0]] * 5), OPTIONS) == 2.0
    assert choose_ratio(np.array([[9, 8, 7]] * 5), OPTIONS) == 4.0  # the largest, whatever it costs


def test_two_nights_or_one_eventful_night_decide_nothing() -> None:
    assert choose_ratio(np.array([[90, 80, 70]] * 2), OPTIONS) == 1.5
    calm = [[1, 0, 0]] * 19
    assert choose_ratio(np.array([*calm, [500, 500, 500]]), OPTIONS) == 1.5


def test_nights_are_forgotten() -> None:
    counts = np.zeros((0, 3), np.int64)
    for night in range(6):
        counts = after_night(counts, np.array([night, 0, 0]), nights=4)
    assert counts[:, 0].tolist() == [2, 3, 4, 5]


def test_a_restless_network_gets_a_larger_ratio(make_world: Callable[..., Any]) -> None:
    options = {"churn": 0.02, "links_per_node": 2.0}
    free = detect.Thresholds(watch_rank=300, swing=Swing(budget=1e9))
    bound = detect.Thresholds(watch_rank=300, swing=Swing(budget=2.0))
    many, few = (make_world(31, thresholds=thresholds, **options) for thresholds in (free, bound))
    counts = {"many": 0, "few": 0}
    for night in range(24):
        for name, world in (("many", many), ("few", few)):
            alerts = world.pass_night()
            counts[name] += sum(alert.kind == "swing" for alert in alerts) if night >= 12 else 0
    assert counts["many"] > 12 * 4
    assert counts["few"] <= 12 * 4
    assert few.state.swings.shape == (23, len(bound.swing.raised) + 1)


def test_ratios_must_rise() -> None:
    with pytest.raises(ValueError, match="must rise"):
        detect.Thresholds(swing=Swing(ratio=2.0, raised=(1.5,)))


def test_an_alarm_under_a_limit_not_in_use_does_not_silence_the_node(
    make_world: Callable[..., Any], monkeypatch: pytest.MonkeyPatch
) -> None:
    options = Drift(limits=(4.0, 14.0), first_limit=14.0, budget=100.0)
    world = make_world(16, nights=20, churn=0.002, thresholds=detect.Thresholds(watch_rank=300, drift=options))
    target = world.at_rank(260)
    told = []
    for number in range(14):
        # the larger limit is in use until the smaller one has raised its alarm, then the smaller one
        monkeypatch.setattr(drift, "_limit_in_use", lambda _, now=number: 1 if now < 4 else 0)
        alerts = world.pass_night(world.pack(world.fresh(2), target))
        alarms = world.state.alarms
        if number == 3:
            assert target in alarms.node[alarms.limit == 0]
        told += [alert for alert in alerts if alert.node == target and alert.kind == "drift"]
    assert len(told) == 1
