from collections.abc import Callable
from dataclasses import replace
from datetime import date
from typing import Any, get_args

import numpy as np
import pytest

from swaygauge import detect
from swaygauge.detect.thresholds import ALL_KINDS, Drift, KindName
from swaygauge.episodes import WORDING
from swaygauge.records import Alert

Maker = Callable[..., Any]


def test_every_kind_has_a_function_a_place_and_words() -> None:
    assert set(detect.KINDS) == set(ALL_KINDS) == set(get_args(KindName)) == set(WORDING)
    for name, kind in detect.KINDS.items():
        assert kind.name == name
        assert (kind.of_snapshot is None) != (kind.of_moves is None)
        assert kind.summary
        assert kind.size


def test_attention_order_is_kind_then_size_then_node() -> None:
    def alert(kind: str, size: float, node: int) -> Alert:
        return Alert("", date(2031, 3, 1), kind, node, "katz", "rose", 2, 1, size)

    given = [alert("swing", 3.0, 1), alert("surge", 4.0, 2), alert("surge", 9.0, 3), alert("held", 1.0, -1)]
    given += [alert("drift", 9.0, 4), alert("swing", 3.0, 0), alert("lambda_jump", 0.1, -1)]
    ordered = [(alert.kind, alert.node) for alert in detect.order_alerts(given)]
    assert ordered == [
        ("held", -1), ("lambda_jump", -1), ("surge", 3), ("surge", 2), ("swing", 0), ("swing", 1), ("drift", 4),
    ]  # fmt: skip


def test_kinds_that_are_switched_off_stay_silent(make_world: Maker) -> None:
    world = make_world(61, size=600, nights=12, churn=0.0)
    target = world.at_rank(300)
    quiet = detect.Thresholds(kinds=("arrival",), watch_rank=300)
    state = world.state
    world.pass_night(world.pack(world.fresh(40), target))
    everything, _ = detect.detect(world.inputs[-1], state, replace(quiet, kinds=ALL_KINDS))
    only, _ = detect.detect(world.inputs[-1], state, quiet)
    assert {alert.kind for alert in everything} >= {"surge"}
    assert {alert.kind for alert in only} <= {"arrival"}


def test_alerts_hold_json_values_and_finite_sizes(make_world: Maker) -> None:
    import json

    world = make_world(62, size=600, nights=12)
    alerts = world.pass_night(world.pack(world.fresh(60), world.at_rank(300)), days=3)
    assert alerts
    for alert in alerts:
        json.dumps(alert.facts, allow_nan=False)
        assert np.isfinite(alert.size)
        assert alert.facts["gap_nights"] == 2
        assert len({other.key for other in alerts}) == len(alerts)


@pytest.mark.parametrize("limits", [(14.0, 16.0), (14.0, 12.0), (12.0, 12.0)])
def test_drift_limits_must_rise_and_hold_the_first(limits: tuple[float, ...]) -> None:
    with pytest.raises(ValueError, match=r"drift\.(first_limit|limits)"):
        detect.Thresholds(drift=Drift(limits=limits))
