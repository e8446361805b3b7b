from collections.abc import Callable
from dataclasses import replace
from datetime import date
from typing import Any

import numpy as np
import pytest

from swaygauge import detect
from swaygauge.detect import Ring
from swaygauge.records import SpectralBounds, Upkeep, Verdict

Maker = Callable[..., Any]
T = detect.Thresholds()
NOBODY = np.zeros(0, np.int32)


def bare(**changes: Any) -> detect.NightInputs:
    """A held night after an accepted one."""
    inputs = detect.NightInputs(
        network="ostrel",
        night=date(2031, 3, 10),
        verdict=Verdict(outcome="hold", results=(), reasons=("kept 0.31, expected at least 0.40",)),
        history=12,
        nodes=3,
        previous=date(2031, 3, 9),
    )
    return replace(inputs, **changes)


def kinds(inputs: detect.NightInputs) -> list[str]:
    return [alert.kind for alert in detect.detect(inputs, None, T)[0]]


def test_a_held_night_says_why() -> None:
    alerts, _ = detect.detect(bare(), None, T)
    assert [alert.kind for alert in alerts] == ["held"]
    assert alerts[0].facts["reasons"] == ["kept 0.31, expected at least 0.40"]
    assert (alerts[0].node, alerts[0].score) == (-1, "")


@pytest.mark.parametrize(
    ("last_seen", "cadence", "missing", "first", "last"),
    [
        (date(2031, 3, 6), 1, 3, "2031-03-07", "2031-03-09"),
        (date(2031, 2, 17), 7, 2, "2031-02-24", "2031-03-03"),
    ],
)
def test_missing_nights_are_told_once(last_seen: date, cadence: int, missing: int, first: str, last: str) -> None:
    alerts, _ = detect.detect(bare(last_seen=last_seen, cadence_days=cadence), None, T)
    overdue = next(alert for alert in alerts if alert.kind == "overdue")
    assert (overdue.size, overdue.facts["first"], overdue.facts["last"]) == (missing, first, last)


def test_a_night_held_in_between_is_not_missing() -> None:
    assert kinds(bare(previous=date(2031, 3, 8), last_seen=date(2031, 3, 9))) == ["held"]
    assert kinds(bare(previous=date(2031, 3, 8))) == ["held", "overdue"]
    assert kinds(bare(previous=None)) == ["held"]


def test_degraded_says_what_was_carried(make_world: Maker) -> None:
    world = make_world(41, size=200, nights=3, churn=0.0)
    repair = Verdict(outcome="repair", results=(), reasons=("lost 0.08",), capped=True)
    inputs = world.show(repair)
    upkeep = Upkeep(310, 12, 0, 0, 0, 0, 0, NOBODY, NOBODY)
    alerts, _ = detect.detect(replace(inputs, upkeep=upkeep), world.state, T)
    assert [alert.kind for alert in alerts] == ["degraded"]
    facts = alerts[0].facts
    assert (facts["carried_links"], facts["carried_sources"], facts["capped"]) == (310, 12, True)
    assert facts["degraded"] is True


@pytest.mark.parametrize(
    ("verdict", "upkeep", "what"),
    [
        (Verdict("fine", (), coverage_step=True), {}, "rise"),
        (Verdict("fine", (), rebaselined=True), {}, "rebaselined"),
        (Verdict("fine", ()), {"coverage_step": True, "expired_links": 40, "coverage_links": 40}, "expired"),
        (Verdict("fine", ()), {"coverage_step": True, "returned_links": 40, "coverage_links": 40}, "returned"),
    ],
)
def test_what_kind_of_coverage_step(make_world: Maker, verdict: Verdict, upkeep: dict[str, Any], what: str) -> None:
    world = make_world(42, size=200, nights=3, churn=0.0)
    inputs = world.show(verdict)
    assert inputs.upkeep is not None
    alerts, _ = detect.detect(replace(inputs, upkeep=replace(inputs.upkeep, **upkeep)), world.state, T)
    assert [(alert.kind, alert.facts["what"]) for alert in alerts] == [("coverage_step", what)]


def test_a_lambda_jump_names_its_nodes_when_they_are_known(make_world: Maker) -> None:
    world = make_world(43, size=200, nights=3, churn=0.0)
    inputs = replace(world.show(Verdict("fine", ())), bounds_now=SpectralBounds(6.0, 6.1, 0))
    plain, _ = detect.detect(inputs, world.state, T)
    assert [(alert.kind, alert.size) for alert in plain] == [("lambda_jump", pytest.approx(0.2))]
    assert "nodes" not in plain[0].facts
    rows = np.zeros(0, np.bool_)
    ring = Ring(np.array([5, 9], np.int32), np.array([0.5, 0.4]), rows, lambda_without=5.01, enough=True)
    named, _ = detect.detect(replace(inputs, ring=ring), world.state, T)
    assert named[0].facts["nodes"] == [5, 9]
    assert named[0].key == plain[0].key
    level, _ = detect.detect(replace(inputs, bounds_now=SpectralBounds(5.1, 5.2, 0)), world.state, T)
    assert level == ()


def test_a_scored_night_must_be_complete() -> None:
    with pytest.raises(ValueError, match="2031-03-10: a scored night needs its book"):
        detect.detect(bare(verdict=Verdict("fine", ())), None, T)
