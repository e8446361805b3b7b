"""swaygauge in a notebook: the same code the night runs, on a network in memory.

>>> network = Network.of([("ada", "bob"), ("bob", "cyd"), ("cyd", "bob")])
>>> round(lambda_bounds(network).upper, 9)
1.0
>>> for rank, name, value in katz(network, alpha=0.5).top(2):
...     print(rank, name, round(value, 9))
1 bob 2.666666667
2 cyd 2.333333333
>>> leaks(network).zeroed_count
0
"""

from __future__ import annotations

from collections.abc import Hashable, Iterable
from dataclasses import dataclass
from datetime import date
from functools import cached_property
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from swaygauge.errors import InputError, ScoreError
from swaygauge.graph import Graph
from swaygauge.moves import compare_scores
from swaygauge.records import Floats, Ids, Moves, ScoreSet, SpectralBounds, frozen
from swaygauge.scores import KatzOptions, Solution
from swaygauge.scores import eigenvector as _eigenvector
from swaygauge.scores import fairshare as _fairshare
from swaygauge.scores import katz as _katz
from swaygauge.scores.leaks import LeakReport, leak_report
from swaygauge.scores.ranks import rank_places
from swaygauge.scores.spectrum import bound_lambda

if TYPE_CHECKING:
    import networkx  # type: ignore[import-untyped]  # networkx ships no type information
    import pandas

FIRST, SECOND = date(1, 1, 1), date(1, 1, 2)  # two graphs in memory carry no night of their own


@dataclass(frozen=True, eq=False)
class Network:
    """A graph whose nodes have names: node i is names[i]. A link source -> target endorses the target."""

    graph: Graph
    names: tuple[Hashable, ...]

    @classmethod
    def of(cls, links: Iterable[tuple[Hashable, Hashable]], *, nodes: Iterable[Hashable] = ()) -> Network:
        """From (source, target) pairs; ``nodes`` adds names that may have no link."""
        pairs = list(links)
        return cls.from_arrays([pair[0] for pair in pairs], [pair[1] for pair in pairs], nodes=nodes)

    @classmethod
    def from_arrays(
        cls,
        source: Iterable[Hashable],
        target: Iterable[Hashable],
        *,
        weight: ArrayLike | None = None,
        nodes: Iterable[Hashable] = (),
    ) -> Network:
        """From two sequences of names (of any hashable type) and maybe weights. Nodes are numbered by first sight.

        Raises InputError when lengths differ or a weight is not a finite number > 0.
        """
        heads, tails = _plain(source), _plain(target)
        number: dict[Hashable, int] = {}
        for name in (*nodes, *heads, *tails):
            number.setdefault(name, len(number))
        ids = [np.fromiter((number[name] for name in side), np.int32, len(side)) for side in (heads, tails)]
        return cls(Graph(len(number), ids[0], ids[1], weight=weight), tuple(number))

    @classmethod
    def from_frame(
        cls, frame: pandas.DataFrame, *, source: str = "source", target: str = "target", weight: str | None = None
    ) -> Network:
        """From a DataFrame with one row per link. Raises InputError for a column that is not there or has gaps."""
        columns = (source, target, *([weight] if weight else []))
        for column in columns:
            if column not in frame.columns:
                raise InputError(f"the frame has no column {column!r}; it has {', '.join(map(str, frame.columns))}.")
        for column in columns:
            gaps = np.flatnonzero(frame[column].isna().to_numpy())
            if len(gaps):
                raise InputError(f"column {column!r}: expected a value in every row, row {gaps[0]} has none.")
        weights = frame[weight].to_numpy() if weight else None
        return cls.from_arrays(frame[source].tolist(), frame[target].tolist(), weight=weights)

    @classmethod
    def from_networkx(cls, graph: networkx.DiGraph, *, weight: str | None = None) -> Network:
        """From a networkx DiGraph or MultiDiGraph (parallel edges: one link, weights added); isolated nodes are kept.

        ``weight`` names the edge attribute that holds the weights; an edge without it counts 1. Raises InputError for
        an undirected graph: say which way endorsement goes with ``graph.to_directed()``.
        """
        if not graph.is_directed():
            raise InputError("expected a directed networkx graph, got an undirected one; see graph.to_directed().")
        edges = list(graph.edges(data=True))
        weights = [data.get(weight, 1.0) for _, _, data in edges] if weight else None
        return cls.from_arrays([edge[0] for edge in edges], [edge[1] for edge in edges], weight=weights, nodes=graph)

    @cached_property
    def bounds(self) -> SpectralBounds:
        """Proven bounds on lambda."""
        return bound_lambda(self.graph)


@dataclass(frozen=True, eq=False)
class Scores:
    """Scores with their proof: |value - exact| <= bound; arrays (n,) in the order of names."""

    score: str
    alpha: float
    names: tuple[Hashable, ...]
    value: Floats
    bound: Floats
    rank: Ids
    best: Ids
    worst: Ids
    residual: float

    def top(self, k: int = 10) -> list[tuple[int, Hashable, float]]:
        """(rank, name, value) of the first k places; equal ranks in the order of names."""
        order = np.lexsort((-self.value, self.rank))[:k]
        return [(int(self.rank[i]), self.names[i], float(self.value[i])) for i in order]

    def frame(self) -> pandas.DataFrame:
        """A DataFrame, best rank first."""
        import pandas

        columns = {name: getattr(self, name) for name in ("value", "bound", "rank", "best", "worst")}
        frame = pandas.DataFrame({"name": list(self.names), **columns})
        return frame.sort_values(["rank", "value"], ascending=[True, False], kind="stable", ignore_index=True)


@dataclass(frozen=True, eq=False)
class Comparison:
    """How ranks moved between two networks; ``moves.ids[i]`` is the node names[i]."""

    names: tuple[Hashable, ...]
    moves: Moves

    def frame(self) -> pandas.DataFrame:
        """A DataFrame, largest move in octaves first, arrivals and departures last."""
        import pandas

        columns = ("status", "value_before", "value_now", "rank_before", "rank_now", "octaves")
        frame = pandas.DataFrame({"name": list(self.names), **{name: getattr(self.moves, name) for name in columns}})
        frame["status"] = frame["status"].map(dict(enumerate(STATUS)))
        order = np.argsort(-np.abs(self.moves.octaves), kind="stable")  # NaN sorts last
        return frame.iloc[order].reset_index(drop=True)


STATUS: Final = ("moved", "arrived", "departed")


def lambda_bounds(network: Network) -> SpectralBounds:
    """Proven bounds on lambda, the spectral radius; both exactly 0 for a network without a cycle."""
    return network.bounds


def katz(network: Network, *, alpha: float | None = None, share: float = 0.8, beta: float | ArrayLike = 1.0) -> Scores:
    """Katz scores; without ``alpha`` it is share / lambda, or .5 for a network without a cycle.

    Raises AlphaTooLarge with the largest safe value when alpha is not proven to be below 1 / lambda.
    """
    alpha = _alpha_for(share, network.bounds) if alpha is None else alpha
    return _scores("katz", network, _katz.katz(network.graph, alpha=alpha, beta=beta))


def fairshare(network: Network, *, alpha: float = 0.85, beta: float | ArrayLike = 1.0) -> Scores:
    """Fair-share scores: values divided by their sum are PageRank with damping alpha.

    >>> fairshare(Network.of([("a", "b"), ("b", "a")])).value.round(3).tolist()
    [6.667, 6.667]
    """
    return _scores("fairshare", network, _fairshare.fairshare(network.graph, alpha=alpha, beta=beta))


def eigenvector(network: Network) -> tuple[Floats, LeakReport]:
    """Plain eigenvector centrality, of length 1, in the order of names, and what it leaves at zero. A diagnostic."""
    return _eigenvector.eigenvector(network.graph), leaks(network)


def leaks(network: Network) -> LeakReport:
    """The strong components and the endorsed nodes that eigenvector centrality leaves at zero."""
    return leak_report(network.graph, bounds=network.bounds)


def compare(
    before: Network, now: Network, *, score: str = "katz", alpha: float | None = None, share: float = 0.8
) -> Comparison:
    """How ranks moved from one network to another, both scored with the same alpha.

    Without ``alpha``: share / the larger lambda for katz, .85 for fairshare. Raises ScoreError for an unknown score.

    >>> before = Network.of([("a", "b"), ("b", "c")])
    >>> compare(before, Network.of([("a", "b"), ("b", "c"), ("c", "b"), ("d", "b")])).moves.rank_now.tolist()
    [3, 1, 2, 3]
    """
    if score not in ("katz", "fairshare"):
        raise ScoreError(f"score: expected 'katz' or 'fairshare', got {score!r}.")
    names = tuple(dict.fromkeys((*before.names, *now.names)))
    number = {name: i for i, name in enumerate(names)}
    if score == "katz":
        larger = max(before.bounds, now.bounds, key=lambda bounds: bounds.upper)
        same = _alpha_for(share, larger) if alpha is None else alpha
        sides = [katz(network, alpha=same) for network in (before, now)]
    else:
        sides = [fairshare(network, alpha=0.85 if alpha is None else alpha) for network in (before, now)]
    sets = [_score_set(side, night, number) for side, night in zip(sides, (FIRST, SECOND), strict=True)]
    return Comparison(names, compare_scores(sets[0], sets[1]))


def _plain(side: Iterable[Hashable]) -> list[Hashable]:
    given: NDArray[Any] | Iterable[Hashable] = side
    plain: list[Hashable] = given.tolist() if isinstance(given, np.ndarray) else list(given)
    return plain


def _alpha_for(share: float, bounds: SpectralBounds) -> float:
    if bounds.upper == 0.0:
        return KatzOptions().acyclic_alpha
    return _katz.safe_alpha(bounds, share)


def _scores(score: str, network: Network, solution: Solution) -> Scores:
    rank, best, worst = rank_places(solution.value, solution.bound)
    return Scores(
        score, solution.alpha, network.names, solution.value, solution.bound, rank, best, worst, solution.residual
    )


def _score_set(scores: Scores, night: date, number: dict[Hashable, int]) -> ScoreSet:
    """The scores over a numbering of names that both sides share, sorted by it."""
    ids = np.fromiter((number[name] for name in scores.names), np.int32, len(scores.names))
    order = np.argsort(ids)
    columns = {name: frozen(getattr(scores, name)[order]) for name in ("value", "bound", "rank", "best", "worst")}
    return ScoreSet(
        night, scores.score, scores.alpha, frozen(ids[order]), **columns, residual=scores.residual, sweeps=0
    )
