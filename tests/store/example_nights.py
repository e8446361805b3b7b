"""A small network whose nights are made from a seed, staged as the nightly run stages them."""

from __future__ import annotations

from datetime import date, timedelta
from typing import Any

import numpy as np

from swaygauge.records import ARRIVED, DEPARTED, MOVED, Alert, Moves, RuleResult, ScoreSet
from swaygauge.store import Store
from swaygauge.store.rows import NightRow

FIRST = date(2031, 3, 1)
NET = "ostrel"


def scores_of(night: date, *, nodes: int, score: str = "katz", seed: int = 0) -> ScoreSet:
    """Made-up scores of ids 0 .. nodes-1; what matters here is that they are plausible and reproducible."""
    value = np.sort(np.random.default_rng([seed, night.toordinal()]).pareto(1.5, nodes) + 1.0)
    value = np.random.default_rng([seed, 7]).permutation(value)  # the same order every night, other values
    rank = (np.argsort(np.argsort(-value)) + 1).astype(np.int32)
    bound = np.full(nodes, 1e-10)
    ids = np.arange(nodes, dtype=np.int32)
    return ScoreSet(night, score, 0.25, ids, value, bound, rank, rank, rank, residual=1e-11, sweeps=9)


def moves_of(before: ScoreSet, now: ScoreSet, *, swap: tuple[int, int] = (0, 1)) -> Moves:
    """Everyone keeps the rank but for a swap, the last id (arrived) and the one before it (departed)."""
    rank_before = now.rank.copy()
    rank_before[list(swap)] = rank_before[list(swap)[::-1]]
    status = np.full(len(now.ids), MOVED, np.uint8)
    status[-1], status[-2] = ARRIVED, DEPARTED
    rank_before[-1] = 0
    rank_now = now.rank.copy()
    rank_now[-2] = 0
    with np.errstate(divide="ignore", invalid="ignore"):
        octaves = np.where(status == MOVED, np.log2(rank_before / rank_now), np.nan)
    return Moves(
        now.night,
        before.night,
        now.score,
        now.ids,
        status,
        before.value,
        now.value,
        rank_before,
        rank_now,
        octaves,
        octaves,
    )


def stage_night(store: Store, night: date, *, nodes: int = 50, seed: int = 0) -> NightRow:
    """Everything a published night stages; the row that publishes it."""
    store.names(NET).intern([f"site-{node}.example" for node in range(nodes)], night=night)
    previous = store.last_accepted(NET, before=night)
    store.clear_staging(NET, night)
    store.stage_part(
        NET,
        night,
        kind="raw",
        columns={"source": np.arange(nodes, dtype=np.int32), "target": np.arange(nodes, dtype=np.int32)[::-1]},
    )
    now = scores_of(night, nodes=nodes, seed=seed)
    store.stage_record(NET, night, kind="scores", record=now, score="katz")
    if previous is not None:
        before = store.record(ScoreSet, NET, previous.night, kind="scores", score="katz")
        store.stage_record(NET, night, kind="moves", record=moves_of(before, now), score="katz")
    store.stage_fact(NET, night, name="leaks", value={"zeroed": 3, "share": 0.1})
    stored = store.night_row(NET, night)
    return NightRow(
        NET,
        night,
        state="published",
        outcome="fine",
        accepted=True,
        previous=previous.night if previous else None,
        basis=previous.digest if previous else "",
        era=FIRST,
        alpha=0.25,
        lambda_lower=3.1,
        lambda_upper=3.2,
        input_file="links.csv",
        input_sha256=f"{seed:064x}",
        input_size=1234,
        version=stored.version if stored else 0,
    )


def alert_of(night: date, *, node: int = 7, kind: str = "surge") -> Alert:
    return Alert(f"{kind}-{node}-{night}", night, kind, node, "katz", "rose", 40, 10, 2.0, {"new_links": 12, "p": 1e-9})


RULE = RuleResult("kept", "kept", 0.97, "at least 0.95", "repair", True)


def run_night(store: Store, night: date, **options: Any) -> NightRow:
    row = stage_night(store, night, **options)
    alert = alert_of(night)
    return store.publish(
        row,
        checks=[RULE],
        alerts=[alert],
        node_names={alert.node: "site-7.example"},
        sentences={alert.key: "site-7.example rose from place 40 to 10."},
    )


def first_nights(count: int) -> list[date]:
    return [FIRST + timedelta(days=at) for at in range(count)]
