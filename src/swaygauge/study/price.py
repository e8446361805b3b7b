"""The price of a place: how many fresh one-link endorsers lift a node to it."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache

import numpy as np

from swaygauge.graph import Graph
from swaygauge.records import Floats
from swaygauge.scores import Solution
from swaygauge.scores.ranks import rank_places
from swaygauge.study.setting import Options, Setting


@dataclass(frozen=True)
class Price:
    """What a place costs one node. ``endorsers`` is None when no number of them buys it."""

    node: int  # by position in the graph
    place: int  # the node's place now
    endorsers: int | None
    confirmed: bool  # solved again: with so many it holds the place, with one fewer it does not


def needed_endorsers(value: Floats, reach: Floats, node: int, *, rank: int, each: float) -> float:
    """The smallest number of fresh endorsers that leaves at most ``rank`` - 1 nodes larger than ``node``; or inf.

    value (n,): x. reach (n,): the column R_.w of R = (I - alpha W')^-1, what one more unit of own importance of
    w = ``node`` adds to every value. each: what one endorser adds to w's own importance, alpha * its value * weight.
    Rivals gain as well, so v is passed at m_v = (x_v - x_w) / (each (R_ww - R_vw)), never where R_vw >= R_ww; and a
    node below that gains more than w itself (katz only) passes w at its own m_v.

    >>> needed_endorsers(np.array([5.0, 3.0, 1.0]), np.array([0.5, 0.0, 1.0]), 2, rank=1, each=0.5)
    16.0
    """
    gap = value - value[node]
    gain = each * (reach[node] - reach)
    at = np.divide(gap, gain, out=np.zeros(len(value)), where=gain != 0.0)
    above = gap > 0.0
    passed = np.sort(at[above & (gain > 0.0)])
    passing = np.sort(at[~above & (gain < 0.0)])
    tries = np.concatenate(([0.0], np.ceil(passed)))
    larger = np.count_nonzero(above) - np.searchsorted(passed, tries, side="right")
    larger += np.searchsorted(passing, tries, side="left")
    enough = np.flatnonzero(larger < rank)
    return float(tries[enough[0]]) if len(enough) else math.inf


def price_of_place(
    graph: Graph,
    setting: Setting,
    now: Solution,
    *,
    options: Options,
    beta: Floats,
    node: int,
    rank: int,
    weight: float,
) -> Price:
    """What place ``rank`` costs ``node``, confirmed by solving again.

    now: the solution of the setting. beta (n,): own importance. weight: of an endorser's one link (it matters to katz
    only: fairshare passes on the whole share whatever the weight). A fresh endorser has the score's default beta and no
    endorser of its own, so its value is exactly that; m of them add m * alpha * beta * weight to the own importance of
    ``node`` and change nothing else, which is how the confirming solves put them in. Raises as the solver does.
    """
    unit = np.zeros(graph.n)
    unit[node] = 1.0
    reach = setting.solve(graph, options=options, beta=unit).value
    each = setting.alpha * options.beta * (weight if setting.score == "katz" else 1.0)
    place = int(rank_places(now.value, now.bound)[0][node])
    number = needed_endorsers(now.value, reach, node, rank=rank, each=each)
    if not math.isfinite(number):
        return Price(node, place, None, False)

    @cache
    def holds(endorsers: int) -> bool:
        more = endorsers * each
        foreseen = now.value + more * reach
        with_them = setting.solve(graph, options=options, beta=beta + more * unit, start=foreseen)
        return int(rank_places(with_them.value, with_them.bound)[0][node]) <= rank

    endorsers = int(number)
    if not holds(endorsers):  # an exact tie, where rounding decides which integer is next
        endorsers += 1
    elif endorsers and holds(endorsers - 1):
        endorsers -= 1
    confirmed = holds(endorsers) and not (endorsers and holds(endorsers - 1))
    return Price(node, place, endorsers, confirmed)


def buyers(value: Floats, *, around: int, count: int) -> list[int]:
    """Nodes (at most ``count``) evenly spread over the places from .8 to 1.2 times ``around``, by value, then position.

    >>> buyers(np.arange(100.0), around=50, count=3)
    [60, 50, 40]
    """
    order = np.lexsort((np.arange(len(value)), -value))
    places = np.linspace(0.8 * around, 1.2 * around, count).round().astype(np.int64) - 1
    at = np.unique(np.clip(places, 0, max(len(value) - 1, 0)))
    return [int(node) for node in order[at]] if len(value) else []
