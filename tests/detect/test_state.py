import json
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from swaygauge import detect
from swaygauge.detect.state import Columns
from swaygauge.records import Verdict

Maker = Callable[..., Any]
WATCHED = detect.Thresholds(watch_rank=300)


def as_bytes(state: detect.DetectorState) -> tuple[dict[str, tuple[str, bytes]], str]:
    columns, scalars = state.to_columns()
    return {name: (str(array.dtype), array.tobytes()) for name, array in columns.items()}, json.dumps(scalars)


def through_json(state: detect.DetectorState) -> detect.DetectorState:
    """As the store keeps it: plain one-dimensional arrays and JSON."""
    columns, scalars = state.to_columns()
    assert all(array.ndim == 1 for array in columns.values())
    kept: Columns = {name: np.frombuffer(array.tobytes(), array.dtype) for name, array in columns.items()}
    return detect.DetectorState.from_columns(kept, json.loads(json.dumps(scalars, allow_nan=False)))


@pytest.fixture
def eventful(make_world: Maker) -> Any:
    """Twenty-four nights with a farm, a drip, an arrival and a gap."""
    world = make_world(31, size=600, thresholds=WATCHED, churn=0.004)
    for number in range(24):
        planted = None
        if number == 15:
            planted = world.pack(world.fresh(30), world.at_rank(200))
        elif number >= 12:
            planted = world.pack(world.fresh(2), 7)
        world.pass_night(planted, days=3 if number == 18 else 1)
    return world


def test_replay_gives_the_same_bytes_also_through_the_store(eventful: Any) -> None:
    state, stored = None, None
    for inputs in eventful.inputs:
        alerts, state = detect.detect(inputs, state, WATCHED)
        again, stored = detect.detect(inputs, stored, WATCHED)
        assert alerts == again
        assert as_bytes(state) == as_bytes(stored)
        stored = through_json(stored)
        assert as_bytes(state) == as_bytes(stored)
    assert as_bytes(state) == as_bytes(eventful.state)
    assert any(len(inputs.moves) for inputs in eventful.inputs)


def test_a_held_night_leaves_the_state_as_it_was(eventful: Any) -> None:
    held = Verdict(outcome="hold", results=(), reasons=("kept 0.21",))
    night = eventful.inputs[-1]
    inputs = replace(night, verdict=held, book=None, changes=None, in_degree_before=None, moves={}, upkeep=None)
    alerts, state = detect.detect(inputs, eventful.state, WATCHED)
    assert state is eventful.state
    assert [alert.kind for alert in alerts] == ["held"]


def test_inputs_and_state_are_not_written_to(eventful: Any) -> None:
    before = as_bytes(eventful.state)
    for array in eventful.state.to_columns()[0].values():
        array.setflags(write=False)
    detect.detect(eventful.inputs[-1], eventful.state, WATCHED)
    assert as_bytes(eventful.state) == before


def test_other_limits_or_tails_start_their_part_again(eventful: Any) -> None:
    nodes = eventful.inputs[-1].nodes
    kept = eventful.state.fitted(nodes + 5, WATCHED)
    assert len(kept.seen) == len(kept.gains.past) == nodes + 5
    assert len(kept.drift.ids) > 0
    other = replace(WATCHED, drift=replace(WATCHED.drift, limits=(12.0, 18.0)))
    assert len(eventful.state.fitted(nodes, other).drift.ids) == 0
    assert len(eventful.state.fitted(nodes, other).guard.present) > 0
    heavier = replace(WATCHED, surge=replace(WATCHED.surge, tail=6.0))
    assert len(eventful.state.fitted(nodes, heavier).guard.present) == 0
    steeper = replace(WATCHED, swing=replace(WATCHED.swing, ratio=1.7))
    assert len(kept.swings) > 0
    assert len(eventful.state.fitted(nodes, steeper).swings) == 0
    detect.detect(eventful.inputs[-1], eventful.state, other)


def test_row_order_of_unrelated_nodes_does_not_matter_to_keys() -> None:
    from datetime import date

    key = detect.alert_key("ostrel", date(2031, 3, 9), "surge", "katz", 17)
    assert len(key) == 20
    assert key == detect.alert_key("ostrel", date(2031, 3, 9), "surge", "katz", 17)
    others = {
        detect.alert_key(*parts)
        for parts in (
            ("ostrel2", date(2031, 3, 9), "surge", "katz", 17),
            ("ostrel", date(2031, 3, 10), "surge", "katz", 17),
            ("ostrel", date(2031, 3, 9), "swing", "katz", 17),
            ("ostrel", date(2031, 3, 9), "surge", "fairshare", 17),
            ("ostrel", date(2031, 3, 9), "surge", "katz", 18),
        )
    }
    assert len(others | {key}) == 6
