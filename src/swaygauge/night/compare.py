"""The compare stage: two nights' scores -> moves, and with the network's memory -> alerts."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import replace
from datetime import date
from typing import Any

import numpy as np

from swaygauge.detect import (
    DetectorState,
    LeadingPair,
    NightInputs,
    Ring,
    detect,
    in_degree,
    is_lambda_jump,
    name_ring,
)
from swaygauge.moves import compare_scores, network_move
from swaygauge.night.history import History, history_of
from swaygauge.night.result import StageResult
from swaygauge.night.scoring import graph_of
from swaygauge.night.work import Work
from swaygauge.overlap import link_keys
from swaygauge.records import (
    GONE,
    Alert,
    Flags,
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
from swaygauge.scores.spectrum import bound_lambda, leading_vectors


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


def _without(book: LinkBook, changes: LinkChanges, rows: Flags) -> LinkBook:
    """The book with what was added on these rows of the changes taken back: new links gone, old weights restored."""
    taken = np.flatnonzero(rows)
    keys = link_keys(book.target, book.source)
    at = np.searchsorted(keys, link_keys(changes.target[taken], changes.source[taken]))
    state = book.state.copy()
    state[at[changes.before[taken] == 0.0]] = GONE
    weight = book.weight
    if weight is not None:
        weight = weight.copy()
        kept = changes.before[taken] > 0.0
        weight[at[kept]] = changes.before[taken[kept]]
    return replace(book, state=state, weight=weight)


def _ring(work: Work, book: LinkBook, changes: LinkChanges, lambda_before: float) -> Ring:
    """Which nodes carry tonight's jump of lambda."""
    scored = graph_of(book)
    vectors = leading_vectors(scored.graph)

    def lambda_without(rows: Flags) -> float:
        return bound_lambda(graph_of(_without(book, changes, rows)).graph).upper

    pair = LeadingPair(ids=scored.ids, right=vectors.right, left=vectors.left, lambda_without=lambda_without)
    limits = work.settings.alerts.network
    return name_ring(
        changes,
        pair,
        lambda_before,
        back_to=limits.lambda_back_to,
        or_to=1.0 + limits.lambda_jump,
        least_mass=limits.ring_mass,
    )


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
        nothing = LinkChanges(*(np.empty(0, kind) for kind in ("i4", "i4", "u1", "f8", "f8", "?")))
        none = np.zeros(common["nodes"], np.int64)
        return NightInputs(**common, book=book, changes=nothing, in_degree_before=none, bounds_now=bounds)
    changes = store.record(LinkChanges, network, night, kind="changes", staged=True)
    adjusted = store.has_part(network, night, kind="adjusted", staged=True)
    base = store.record(LinkBook, network, night, kind="adjusted", staged=True) if adjusted else history.book()
    assert base is not None
    bounds_before = (
        bound_lambda(graph_of(base).graph)
        if adjusted
        else store.record(SpectralBounds, network, before.night, kind="bounds")
    )
    jumped = is_lambda_jump(bounds_before, bounds, jump=work.settings.alerts.network.lambda_jump)
    return NightInputs(
        **common,
        book=book,
        changes=changes,
        upkeep=store.record(Upkeep, network, night, kind="upkeep", staged=True),
        in_degree_before=in_degree(base, common["nodes"]),
        moves=_moves(work, history, night),
        bounds_before=bounds_before,
        bounds_now=bounds,
        ring=_ring(work, book, changes, bounds_before.upper) if jumped else None,
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
