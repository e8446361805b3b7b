"""The compare stage: two nights' scores -> moves, and with the network's memory -> alerts."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from datetime import date
from typing import Any

import numpy as np

from swaygauge.detect import DetectorState, NightInputs, detect
from swaygauge.moves import compare_scores, network_move
from swaygauge.night.history import History, history_of
from swaygauge.night.result import StageResult
from swaygauge.night.steps import compared_inputs, first_inputs, graph_of
from swaygauge.night.work import Work
from swaygauge.records import (
    Alert,
    Ids,
    LinkBook,
    LinkChanges,
    Moves,
    ScoreSet,
    SpectralBounds,
    Upkeep,
    Verdict,
)
from swaygauge.scores import SCORES
from swaygauge.scores.spectrum import bound_lambda


def stage_alerts(work: Work, night: date, alerts: tuple[Alert, ...]) -> None:
    """Keep a night's alerts until they are published."""
    told = [dataclasses.asdict(alert) | {"night": alert.night.isoformat()} for alert in alerts]
    work.store.stage_fact(work.network, night, name="alerts", value=told)


def staged_alerts(work: Work, night: date) -> tuple[Alert, ...]:
    """The alerts that :func:`stage_alerts` kept."""
    told: list[dict[str, Any]] = work.store.fact(work.network, night, name="alerts", staged=True)
    return tuple(Alert(**item | {"night": date.fromisoformat(item["night"])}) for item in told)


def _state(work: Work, history: History) -> DetectorState | None:
    if history.previous is None:
        return None
    night = history.previous.night
    columns = work.store.part(work.network, night, kind="detector")
    return DetectorState.from_columns(columns, work.store.fact(work.network, night, name="detector"))


def _keep_state(work: Work, night: date, state: DetectorState) -> None:
    columns, scalars = state.to_columns()
    work.store.stage_part(work.network, night, kind="detector", columns=columns, ragged=True)
    work.store.stage_fact(work.network, night, name="detector", value=scalars)


def _moves(work: Work, history: History, night: date) -> dict[str, Moves]:
    """Moves of every score against last night, re-scored where the score stage did so; the network's beside."""
    before = history.previous
    if before is None:
        return {}
    store, network = work.store, work.network
    moves = {}
    for name in SCORES:
        bridged = store.has_part(network, night, kind="bridge", score=name, staged=True)
        then = (
            store.record(ScoreSet, network, night, kind="bridge", score=name, staged=True)
            if bridged
            else store.record(ScoreSet, network, before.night, kind="scores", score=name)
        )
        now = store.record(ScoreSet, network, night, kind="scores", score=name, staged=True)
        moves[name] = compare_scores(then, now)
        store.stage_record(network, night, kind="moves", record=moves[name], score=name)
        whole = network_move(then, now, depth=work.settings.scores.top, gap_nights=history.gap_nights)
        store.stage_record(network, night, kind="network", record=whole, score=name)
    return moves


def _watched(work: Work, names: tuple[str, ...]) -> Ids:
    ids = work.store.names(work.network).lookup(list(names)) if names else np.empty(0, np.int32)
    return np.unique(ids[ids >= 0]).astype(np.int32)


def _inputs(work: Work, history: History, night: date) -> NightInputs:
    store, network = work.store, work.network
    verdict = store.record(Verdict, network, night, kind="verdict", staged=True)
    before = history.previous
    common: Mapping[str, Any] = {
        "network": network,
        "night": night,
        "verdict": verdict,
        "history": len(history.accepted),
        "nodes": len(store.names(network)),
        "previous": before.night if before else None,
        "last_seen": history.last_seen,
        "cadence_days": work.settings.snapshots.every_nights,
        "gap_nights": history.gap_nights,
    }
    if verdict.outcome == "hold":
        return NightInputs(**common)
    book = store.record(LinkBook, network, night, kind="book", staged=True)
    bounds = store.record(SpectralBounds, network, night, kind="bounds", staged=True)
    if before is None:
        return first_inputs(common, book, bounds)
    changes = store.record(LinkChanges, network, night, kind="changes", staged=True)
    adjusted = store.has_part(network, night, kind="adjusted", staged=True)
    base = store.record(LinkBook, network, night, kind="adjusted", staged=True) if adjusted else history.book()
    assert base is not None
    bounds_before = (
        bound_lambda(graph_of(base).graph)
        if adjusted
        else store.record(SpectralBounds, network, before.night, kind="bounds")
    )
    return compared_inputs(
        common,
        book,
        changes,
        base=base,
        bounds_before=bounds_before,
        bounds=bounds,
        thresholds=work.settings.alerts,
        upkeep=store.record(Upkeep, network, night, kind="upkeep", staged=True),
        moves=_moves(work, history, night),
        rescored=store.has_part(network, night, kind="bridge", score="katz", staged=True),
        watch_ids=_watched(work, work.settings.alerts.watch_names),
    )


def compare(work: Work, night: date) -> StageResult:
    """Scores of two nights and the memory of the nights before -> moves, alerts, new memory."""
    history = history_of(work, night)
    inputs = _inputs(work, history, night)
    alerts, state = detect(inputs, _state(work, history), work.settings.alerts)
    stage_alerts(work, night, alerts)
    if inputs.book is not None:
        _keep_state(work, night, state)
    return StageResult(len(alerts), f"{len(alerts)} alerts")
