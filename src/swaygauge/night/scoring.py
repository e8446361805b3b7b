"""The score stage: effective links -> graph -> proven bounds, alpha for the era, both scores, leaks."""

from __future__ import annotations

from datetime import date

import numpy as np

from swaygauge.night.history import History, history_of
from swaygauge.night.naming import resolved
from swaygauge.night.result import StageResult
from swaygauge.night.steps import Scored, era_pin, graph_of, solve_scores
from swaygauge.night.work import Work
from swaygauge.readers.lists import read_values
from swaygauge.records import Floats, Ids, LinkBook, Pin, ScoreSet, SpectralBounds, Verdict
from swaygauge.scores import SCORES, FairshareOptions, KatzOptions
from swaygauge.scores.leaks import leak_report
from swaygauge.scores.spectrum import bound_lambda


def own_importance(work: Work, night: date, ids: Ids, default: float) -> float | Floats:
    """beta: one number for all, or one per node where the settings name a file of them."""
    file = work.beside(work.settings.snapshots.beta)
    if file is None:
        return default
    told = read_values(file, normalise=work.settings.reader.normalise_hosts).values
    canonical = resolved(work, night).canonical
    nodes = work.store.names(work.network).lookup([canonical.get(name, name) for name in told])
    beta = np.full(len(ids), default)
    place = np.minimum(np.searchsorted(ids, nodes), len(ids) - 1)
    here = ids[place] == nodes
    beta[place[here]] = np.array(list(told.values()))[here]
    return beta


def solve_all(work: Work, night: date, scored: Scored, pin: Pin) -> dict[str, ScoreSet]:
    """Every score of SCORES on one graph, as the settings say."""
    options: dict[str, KatzOptions | FairshareOptions] = {name: getattr(work.settings.scores, name) for name in SCORES}
    beta = {name: own_importance(work, night, scored.ids, option.beta) for name, option in options.items()}
    return solve_scores(night, scored, pin, options=options, beta=beta)


def _pin(work: Work, history: History, night: date, bounds: SpectralBounds) -> tuple[Pin, bool]:
    before, options = history.previous, work.settings.scores.katz
    if before is None:
        return era_pin(None, None, bounds, night=night, options=options)
    pinned = work.store.record(Pin, work.network, before.night, kind="pin")
    last = work.store.record(SpectralBounds, work.network, before.night, kind="bounds")
    return era_pin(pinned, last, bounds, night=night, options=options)


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
