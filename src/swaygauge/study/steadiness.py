"""How much of a place is crawl luck: the delta-method noise of values and places when links are missed at random.

Each link is missed with probability p, independently of all others. To first order a missed link of u takes
d_k = alpha x_u (row of W with the link - row without it) from the own importance of its targets, and the
value of w changes by sum_k R_wk d_k with R = (I - alpha W')^-1. Hence

    mean shift = -p sum_links R d,    Var(x_w) = p (1 - p) sum_links (R d)_w^2.

What a missed link does to its own source's value, along ways that lead back to it, is left out: exact where there is
no cycle, too large by a factor 1 + alpha w R_uv for katz where there is one. That, and the discreteness of single
links, is why a resampling run stands beside it.

The sum of squares over all links is estimated for all nodes at once with random signs: for xi = sum_links +-d the mean
of (R xi)_w^2 is exactly that sum (Hutchinson 1990, "A stochastic estimator of the trace of the influence matrix for
Laplacian smoothing splines", Communications in Statistics 19(2), gives the device).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from swaygauge.errors import ScoreError
from swaygauge.graph import Graph
from swaygauge.records import Flags, Floats, Ids, Ints
from swaygauge.study.setting import Options, Setting

SIGNS = np.array([-1.0, 1.0])
NEARLY_ALL = 1e-9  # a link with all but this share of its source's weight is treated as having all but this


@dataclass(frozen=True, eq=False)
class Links:
    """The links of a graph, (m,) each, nodes by number."""

    source: Ids
    target: Ids
    weight: Floats | None  # None when every link counts 1

    @classmethod
    def of(cls, graph: Graph) -> Links:
        """The links in the order of the graph's rows."""
        rows = graph.rows
        target = np.repeat(graph.order, np.diff(rows.start))
        return cls(graph.order[rows.source], target, rows.weight if graph.weighted else None)

    def without(self, missed: Flags, n: int) -> Graph:
        """The graph of the links that are left."""
        kept = ~missed
        weight = None if self.weight is None else self.weight[kept]
        return Graph(n, self.source[kept], self.target[kept], weight=weight)


@dataclass(frozen=True, eq=False)
class Push:
    """What each link carries, for one score on one network: sign vectors in, changes of own importance out."""

    links: Links
    carried: Floats  # (m,) alpha x_u W_uv
    regained: Floats | None  # fairshare (m,): what a missed link's source passes on to each of its others, per carried
    n: int

    @classmethod
    def of(cls, graph: Graph, setting: Setting, value: Floats) -> Push:
        """From the solved values x (n,)."""
        links = Links.of(graph)
        weight = np.ones(graph.m) if links.weight is None else links.weight
        passed = setting.alpha * value[links.source] * weight
        if setting.score == "katz":
            return cls(links, passed, None, graph.n)
        strength = graph.out_strength()[links.source]
        only = graph.out_degree()[links.source] == 1
        rest = np.maximum(strength - weight, NEARLY_ALL * strength)
        return cls(links, passed / strength, np.where(only, 0.0, weight / rest), graph.n)

    def change(self, sign: Floats) -> Floats:
        """(n,) sum over links of sign * d, d the loss of own importance when that link alone is missed."""
        lost = sign * self.carried
        if self.regained is not None:
            spread = sign * self.regained
            by_source = np.bincount(self.links.source, spread, minlength=self.n)
            lost -= self.carried * (by_source[self.links.source] - spread)
        change: Floats = np.bincount(self.links.target, lost, minlength=self.n).astype(np.float64)
        return change


@dataclass(frozen=True, eq=False)
class Noise:
    """Crawl noise of chosen nodes: standard deviation of their values and a band of places. Never a p-value."""

    rate: float  # p
    draws: int  # J
    nodes: Ids  # (k,) by position in the graph
    rank: Ids  # (k,) the place now
    expected: Floats  # (k,) the value to be expected when links are missed at the rate
    sd: Floats  # (k,) of the value
    first: Ints  # (k,) the band: first to last place over the draws
    last: Ints


class Reach:
    """R applied to changes of own importance of either sign, for one score on one network; one solve each.

    base (n,) >= 0: what is added, as often as needed, to make a change a legal own importance; R base is taken off
    again, so errors are the solver's tolerance relative to R base. The solved values themselves serve.
    """

    def __init__(self, graph: Graph, setting: Setting, base: Floats, *, options: Options) -> None:
        self._graph, self._setting, self._options = graph, setting, options
        self._base = base
        self._of_base = self._solve(base)

    def _solve(self, own: Floats) -> Floats:
        return self._setting.solve(self._graph, options=self._options, beta=own).value

    def of(self, own: Floats) -> Floats:
        """R own (n,). Raises as the solver does."""
        needed = np.divide(-own, self._base, out=np.zeros(len(own)), where=self._base > 0.0)
        lift = 1.0 + max(0.0, float(needed.max(initial=0.0)))
        reached: Floats = self._solve(own + lift * self._base) - lift * self._of_base
        return reached


def crawl_noise(
    graph: Graph,
    setting: Setting,
    value: Floats,
    *,
    options: Options,
    rank: Ids,
    top: int,
    rate: float,
    draws: int = 48,
    seed: int = 0,
) -> Noise:
    """The noise of every node with rank <= top, from ``draws`` random-sign solves.

    value, rank (n,): the setting's solution. The band of places is the range over the draws of the place in
    x + mean shift + sqrt(p (1 - p)) R xi, where everybody's noise counts and not the node's own alone: one more draw
    would lie in it with probability (draws - 1) / (draws + 1), 96 % for 48, as 2 sd would have it. Raises ScoreError
    for a rate outside (0, 1), NotConverged.
    """
    if not 0.0 < rate < 1.0:
        raise ScoreError(f"rate: expected a share of links between 0 and 1, got {rate!r}.")
    push = Push.of(graph, setting, value)
    scale = float(np.sqrt(rate * (1.0 - rate)))
    reach = Reach(graph, setting, value, options=options)
    expected = value - rate * reach.of(push.change(np.ones(graph.m)))
    top_nodes = np.flatnonzero(rank <= top)
    nodes: Ids = top_nodes[np.argsort(rank[top_nodes], kind="stable")].astype(np.int32)
    squares = np.zeros(len(nodes))
    first, last = np.full(len(nodes), graph.n), np.ones(len(nodes), np.int64)
    random = np.random.default_rng([seed, 1])
    for _ in range(draws):
        sign = random.choice(SIGNS, graph.m)
        noise = scale * reach.of(push.change(sign))
        squares += noise[nodes] ** 2
        place = _places(expected + noise, nodes)
        np.minimum(first, place, out=first)
        np.maximum(last, place, out=last)
    return Noise(rate, draws, nodes, rank[nodes], expected[nodes], np.sqrt(squares / draws), first, last)


def _places(value: Floats, nodes: Ids) -> Ints:
    """1 + how many nodes are larger, by more than rounding, for some of the nodes."""
    rising = np.sort(value)
    return 1 + len(value) - np.searchsorted(rising, value[nodes] * (1.0 + 1e-9), side="right")
