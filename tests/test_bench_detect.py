"""Parts of the detection benchmark: its nights are the store's nights, its truth is the demo generator's."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from datetime import date
from pathlib import Path

import numpy as np
import pytest
from bench.detect.plans import MODELS, Plan, fast_radius, fast_standing, plans, runner_of
from bench.detect.runner import Options, run_series
from bench.detect.series import NightSeen, run_plan
from bench.detect.table import Row, rows
from islands.scoring import spectral_radius, standing
from night.support import reader_of, run_all

from swaygauge.detect import Thresholds
from swaygauge.records import Snapshot


def test_the_runner_tells_what_the_store_tells(mini: Callable[..., Path]) -> None:
    extra = "[alerts]\nwatch_rank = 60\nquiet_history = 2\n"
    work, _ = run_all(mini(7, skip=(4,), extra=extra))
    accepted = work.store.accepted_nights(work.network, before=date.max)
    snapshots = [work.store.record(Snapshot, work.network, row.night, kind="raw") for row in accepted]
    options = Options(network=work.network, thresholds=Thresholds(watch_rank=60, quiet_history=2))
    told = list(run_series([(snapshot, len(work.store.names(work.network))) for snapshot in snapshots], options))
    reader = reader_of(work)
    stored = [reader.alerts(work.network, first=row.night) for row in accepted]
    assert [[alert.key for alert in night.alerts] for night in told] == [[row.key for row in night] for night in stored]
    assert sum(len(night) for night in stored) >= 3


@pytest.mark.parametrize("score", ["katz", "fairshare"])
def test_the_fast_way_to_places_is_the_plain_one(score: str) -> None:
    world = runner_of(Plan("collegemsg", "alike", 1, False)).world
    weight = np.ones(len(world.keys), np.int64)
    radius = spectral_radius(world.keys, world.capacity)
    assert fast_radius(world.keys, world.capacity, weight) == pytest.approx(radius, rel=1e-6)
    plain = standing(world.keys, world.capacity, score, alpha=0.8 / radius if score == "katz" else 0.85)
    fast = fast_standing(world.keys, world.capacity, score, alpha=0.8 / radius if score == "katz" else 0.85)
    np.testing.assert_allclose(fast.value, plain.value, rtol=1e-8)
    assert np.mean(fast.place == plain.place) > 0.999  # nodes a rounding apart may share a place in one only


def test_the_plans_cover_what_they_must_and_report_on_fresh_seeds() -> None:
    chosen = plans("report")
    for model in MODELS:
        usual = [plan for plan in chosen if plan.model == model and plan.faults == "usual" and not plan.triple]
        assert sum(plan.events for plan in usual) >= 6
        assert sum(not plan.events for plan in usual) >= 6
        assert len({plan.base for plan in usual}) >= 3
    assert min(plan.nights for plan in chosen) >= 46
    assert not {plan.seed for plan in chosen} & {plan.seed for plan in plans("design")}


def test_the_table_can_fail() -> None:
    plan = Plan("collegemsg", "alike", 5, False, nights=24)
    seen = run_plan(plan)
    assert run_plan(plan).digest == seen.digest
    table = {row.quantity: row for row in rows([seen], rerun_same=True) if row.model != "unlike"}
    assert table["verdict: normal nights fine"].state == "aim"
    blind = tuple(replace(night, outcome="hold") for night in seen.nights)
    table = {r.quantity: r for r in rows([replace(seen, nights=blind)], rerun_same=False) if r.model != "unlike"}
    assert table["verdict: normal nights fine"].state == "MISSED"
    assert table["re-run from the same snapshots is byte-identical"].state == "MISSED"
    assert Row("q", "alike", None, 1, 1, True, note="not built").state == "not built"
    assert all(isinstance(night, NightSeen) for night in seen.nights)
