"""The score stage: effective links -> graph -> proven bounds, alpha for the era, both scores, leaks."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date

import numpy as np

from swaygauge.graph import Graph
from swaygauge.night.history import History, history_of
from swaygauge.night.result import StageResult
from swaygauge.night.work import Work
from swaygauge.readers.lists import read_values
from swaygauge.records import Floats, Ids, LinkBook, Pin, ScoreSet, SpectralBounds, Verdict, frozen
from swaygauge.scores import SCORES, Solution
from swaygauge.scores.katz import pin_alpha
from swaygauge.scores.leaks import leak_report
from swaygauge.scores.ranks import rank_places
from swaygauge.scores.spectrum import bound_lambda


@dataclass(frozen=True)
class Scored:
    """The effective links of one night as a graph over compact positions; ``ids[position]`` is the node."""

    ids: Ids
    graph: Graph


def graph_of(book: LinkBook) -> Scored:
    """The graph of the links in effect."""
    on = book.in_effect
    source, target = book.source[on], book.target[on]
    ids = np.unique(np.concatenate([source, target])).astype(np.int32)
    place = np.searchsorted(ids, source).astype(np.int32), np.searchsorted(ids, target).astype(np.int32)
    weight = None if book.weight is None else book.weight[on]
    return Scored(frozen(ids), Graph(len(ids), place[0], place[1], weight=weight))


def own_importance(work: Work, ids: Ids, default: float) -> float | Floats:
    """beta: one number for all, or one per node where the settings name a file of them."""
    file = work.beside(work.settings.snapshots.beta)
    if file is None:
        return default
    told = read_values(file, normalise=work.settings.reader.normalise_hosts).values
    names = list(told)
    nodes = work.store.names(work.network).lookup(names)
    beta = np.full(len(ids), default)
    for node, name in zip(nodes.tolist(), names, strict=True):
        place = int(np.searchsorted(ids, node))
        if node >= 0 and place < len(ids) and ids[place] == node:
            beta[place] = told[name]
    return beta


def as_score_set(night: date, score: str, ids: Ids, solution: Solution) -> ScoreSet:
    """A proven solution with its ranks, over persistent ids."""
    rank, best, worst = rank_places(solution.value, solution.bound)
    return ScoreSet(
        night=night,
        score=score,
        alpha=solution.alpha,
        ids=ids,
        value=frozen(solution.value),
        bound=frozen(solution.bound),
        rank=frozen(rank),
        best=frozen(best),
        worst=frozen(worst),
        residual=solution.residual,
        sweeps=solution.sweeps,
    )


def solve_all(work: Work, night: date, scored: Scored, pin: Pin) -> dict[str, ScoreSet]:
    """Every score of SCORES on one graph."""
    done = {}
    for name, score in SCORES.items():
        options = getattr(work.settings.scores, name)
        beta = own_importance(work, scored.ids, options.beta)
        solution = score.solve(scored.graph, options=options, alpha=pin.alpha, beta=beta)
        done[name] = as_score_set(night, name, scored.ids, solution)
    return done


def _pin(work: Work, history: History, night: date, bounds: SpectralBounds) -> tuple[Pin, bool]:
    """alpha of the era, and whether tonight starts one. Legal on last night's graph too, which may be re-scored."""
    before = history.previous
    options = work.settings.scores.katz
    if before is None:
        return pin_alpha(None, bounds, night=night, options=options)
    store = work.store
    pinned = store.record(Pin, work.network, before.night, kind="pin")
    last = store.record(SpectralBounds, work.network, before.night, kind="bounds")
    both = replace(bounds, lower=max(bounds.lower, last.lower), upper=max(bounds.upper, last.upper))
    return pin_alpha(pinned, both, night=night, options=options)


def _bridge(work: Work, history: History, night: date, pin: Pin, now: dict[str, ScoreSet]) -> int:
    """Re-score last night where it cannot be compared as it stands: another alpha, or other coverage."""
    before = history.previous
    if before is None:
        return 0
    store, network = work.store, work.network
    adjusted = store.has_part(network, night, kind="adjusted", staged=True)
    stored = {name: store.record(ScoreSet, network, before.night, kind="scores", score=name) for name in now}
    if not adjusted and all(stored[name].alpha == now[name].alpha for name in now):
        return 0
    book = store.record(LinkBook, network, night, kind="adjusted", staged=True) if adjusted else history.book()
    assert book is not None
    for name, scores in solve_all(work, before.night, graph_of(book), pin).items():
        store.stage_record(network, night, kind="bridge", record=scores, score=name)
    return 1


def score(work: Work, night: date) -> StageResult:
    """Effective links -> scores that carry their proof."""
    store, network = work.store, work.network
    if store.record(Verdict, network, night, kind="verdict", staged=True).outcome == "hold":
        return StageResult(0, "held: nothing is scored")
    history = history_of(work, night)
    scored = graph_of(store.record(LinkBook, network, night, kind="book", staged=True))
    bounds = bound_lambda(scored.graph)
    pin, new_era = _pin(work, history, night, bounds)
    now = solve_all(work, night, scored, pin)
    for name, scores in now.items():
        store.stage_record(network, night, kind="scores", record=scores, score=name)
    bridged = _bridge(work, history, night, pin, now)
    store.stage_record(network, night, kind="pin", record=pin)
    store.stage_record(network, night, kind="bounds", record=bounds)
    report = leak_report(scored.graph, bounds=bounds)
    store.stage_record(network, night, kind="leaks", record=report.with_ids(scored.ids))
    era = ", new era" if new_era else ""
    return StageResult(
        len(scored.ids), f"{len(scored.ids)} nodes, alpha {pin.alpha:.6g}{era}{', last night re-scored' * bridged}"
    )
