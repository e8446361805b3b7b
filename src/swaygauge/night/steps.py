"""What a night computes from records alone. The stages load and save around these; without a store they stand alone."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import date
from typing import Any, Final

import numpy as np

from swaygauge.checks.limits import Limits
from swaygauge.checks.verdict import accept_anyway, rebaseline, rebaseline_due
from swaygauge.detect import LeadingPair, NightInputs, Ring, Thresholds, in_degree, is_lambda_jump, name_ring
from swaygauge.graph import Graph
from swaygauge.overlap import link_keys
from swaygauge.records import (
    GONE,
    Flags,
    Floats,
    Ids,
    LinkBook,
    LinkChanges,
    Pin,
    Profile,
    ScoreSet,
    Snapshot,
    SpectralBounds,
    Verdict,
    frozen,
)
from swaygauge.scores import SCORES, FairshareOptions, KatzOptions, Solution
from swaygauge.scores.katz import pin_alpha
from swaygauge.scores.ranks import rank_places
from swaygauge.scores.spectrum import bound_lambda, leading_vectors

LOOK_BACK: Final = 28  # accepted nights among which the fine ones are looked for
TRAILING: Final = 14  # accepted nights that medians and spreads rest on (method: 14)


@dataclass(frozen=True)
class Scored:
    """The effective links of one night as a graph over compact positions; ``ids[position]`` is the node."""

    ids: Ids
    graph: Graph


def trailing_profiles(judged: Iterable[tuple[Profile, Verdict]]) -> tuple[list[Profile], list[Profile]]:
    """Of accepted nights, oldest first: those since the last change of baseline, and the fine ones; 14 each at most."""
    baseline: list[Profile] = []
    fine: list[Profile] = []
    for profile, verdict in judged:
        if verdict.starts_baseline:
            baseline = []
        baseline.append(profile)
        if verdict.outcome == "fine":
            fine.append(profile)
    return baseline[-TRAILING:], fine[-TRAILING:]


def settled(
    verdict: Verdict, snapshot: Snapshot, held: Sequence[Snapshot], *, limits: Limits, by_hand: bool = False
) -> Verdict:
    """``verdict``, unless it holds a night that a person accepted or that agrees with the ones ``held`` before it."""
    if verdict.outcome != "hold":
        return verdict
    if by_hand:
        return accept_anyway(verdict)
    return rebaseline(verdict) if rebaseline_due(verdict, held, snapshot, limits) else verdict


def known_now(night: date, known: Mapping[str, Ids] | None, book: LinkBook) -> dict[str, Ids]:
    """Every node of any effective snapshot so far, with the night (ordinal) it was first there."""
    ids = np.unique(np.concatenate([book.source[book.in_effect], book.target[book.in_effect]])).astype(np.int32)
    first = np.full(len(ids), night.toordinal(), np.int32)
    if known is None:
        return {"id": ids, "first_night": first}
    new = ~np.isin(ids, known["id"], assume_unique=True)
    every = np.concatenate([known["id"], ids[new]])
    order = np.argsort(every, kind="stable")
    return {"id": every[order], "first_night": np.concatenate([known["first_night"], first[new]])[order]}


def graph_of(book: LinkBook) -> Scored:
    """The graph of the links in effect."""
    on = book.in_effect
    source, target = book.source[on], book.target[on]
    there = np.zeros(int(max(source.max(initial=-1), target.max(initial=-1))) + 1, np.bool_)
    there[source] = True
    there[target] = True
    ids = np.flatnonzero(there).astype(np.int32)
    place = np.cumsum(there, dtype=np.int32) - 1
    weight = None if book.weight is None else book.weight[on]
    return Scored(frozen(ids), Graph(len(ids), place[source], place[target], weight=weight))


def era_pin(
    pinned: Pin | None, last: SpectralBounds | None, bounds: SpectralBounds, *, night: date, options: KatzOptions
) -> tuple[Pin, bool]:
    """alpha of the era, and whether tonight starts one. Legal on last night's graph too, which may be re-scored."""
    if last is not None:
        bounds = replace(bounds, lower=max(bounds.lower, last.lower), upper=max(bounds.upper, last.upper))
    return pin_alpha(pinned, bounds, night=night, options=options)


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


def solve_scores(
    night: date,
    scored: Scored,
    pin: Pin,
    *,
    options: Mapping[str, KatzOptions | FairshareOptions],
    beta: Mapping[str, float | Floats],
) -> dict[str, ScoreSet]:
    """Every score of SCORES on one graph; ``options`` and ``beta`` (own importance) by score."""
    done = {}
    for name, score in SCORES.items():
        solution = score.solve(scored.graph, options=options[name], alpha=pin.alpha, beta=beta[name])
        done[name] = as_score_set(night, name, scored.ids, solution)
    return done


def without(book: LinkBook, changes: LinkChanges, rows: Flags) -> LinkBook:
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


def ring_of(
    book: LinkBook, changes: LinkChanges, before: SpectralBounds, now: SpectralBounds, *, thresholds: Thresholds
) -> Ring | None:
    """Which nodes carry tonight's jump of lambda; None when there is no jump."""
    limits = thresholds.network
    if not is_lambda_jump(before, now, jump=limits.lambda_jump):
        return None
    scored = graph_of(book)
    vectors = leading_vectors(scored.graph)

    def lambda_without(rows: Flags) -> float:
        return bound_lambda(graph_of(without(book, changes, rows)).graph).upper

    pair = LeadingPair(ids=scored.ids, right=vectors.right, left=vectors.left, lambda_without=lambda_without)
    return name_ring(
        changes,
        pair,
        before.upper,
        back_to=limits.lambda_back_to,
        or_to=1.0 + limits.lambda_jump,
        least_mass=limits.ring_mass,
    )


def first_inputs(common: Mapping[str, Any], book: LinkBook, bounds: SpectralBounds) -> NightInputs:
    """The detector's inputs on the first night, which is compared with nothing."""
    nothing = LinkChanges(*(np.empty(0, kind) for kind in ("i4", "i4", "u1", "f8", "f8", "?")))
    none = np.zeros(common["nodes"], np.int64)
    return NightInputs(**common, book=book, changes=nothing, in_degree_before=none, bounds_now=bounds)


def compared_inputs(
    common: Mapping[str, Any],
    book: LinkBook,
    changes: LinkChanges,
    *,
    base: LinkBook,
    bounds_before: SpectralBounds,
    bounds: SpectralBounds,
    thresholds: Thresholds,
    **more: Any,
) -> NightInputs:
    """The detector's inputs on a later night. ``base``: the book compared with, last night's or as adjusted."""
    return NightInputs(
        **common,
        book=book,
        changes=changes,
        in_degree_before=in_degree(base, common["nodes"]),
        bounds_before=bounds_before,
        bounds_now=bounds,
        ring=ring_of(book, changes, bounds_before, bounds, thresholds=thresholds),
        **more,
    )
