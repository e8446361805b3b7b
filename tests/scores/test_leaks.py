"""Leaks: structure by hand and against networkx."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest

from swaygauge.graph import Graph
from swaygauge.scores.eigenvector import eigenvector
from swaygauge.scores.katz import katz
from swaygauge.scores.leaks import leak_report


def test_an_acyclic_network_leaks_everything_and_katz_still_ranks() -> None:
    rng = np.random.default_rng(1)
    low, high = np.sort(rng.integers(0, 500, (2, 3000)), axis=0)
    keep = low < high
    graph = Graph(500, low[keep], high[keep])
    report = leak_report(graph)
    assert (report.lambda_lower, report.lambda_upper) == (0.0, 0.0)
    assert (report.components, report.nontrivial, report.largest) == (500, 0, 1)
    assert not eigenvector(graph).any()
    endorsed = graph.in_degree() > 0
    assert report.zeroed_count == endorsed.sum()
    assert set(report.ids.tolist()) == set(np.flatnonzero(endorsed).tolist())
    assert (np.diff(report.in_degree) <= 0).all()
    value = katz(graph, alpha=0.05).value
    assert len(np.unique(value)) > 400
    assert value.argmax() > 400, "score gathers downstream"


@pytest.mark.parametrize("seed", range(20))
def test_counts_against_networkx(seed: int) -> None:
    rng = np.random.default_rng(seed)
    n = 80
    source, target = rng.integers(0, n, 110), (n * rng.random(110) ** 2).astype(int)
    graph = Graph(n, source, target)
    peer = nx.DiGraph(list(zip(source.tolist(), target.tolist(), strict=True)))
    peer.add_nodes_from(range(n))
    parts = list(nx.strongly_connected_components(peer))
    report = leak_report(graph, named=7)
    assert report.components == len(parts)
    assert report.nontrivial == sum(len(part) > 1 for part in parts)
    largest = {frozenset(part) for part in parts if len(part) == max(map(len, parts))}
    assert report.largest == len(next(iter(largest)))
    if len(largest) == 1:
        inside = next(iter(largest))
        node = next(iter(inside))
        assert report.upstream_share == pytest.approx(len(nx.ancestors(peer, node) - inside) / n)
        assert report.downstream_share == pytest.approx(len(nx.descendants(peer, node) - inside) / n)
    centrality = eigenvector(graph)
    zeroed = (centrality <= 1e-12 * centrality.max()) & (graph.in_degree() > 0)
    assert report.zeroed_count == zeroed.sum()
    assert len(report.ids) == min(7, zeroed.sum())
    assert zeroed[report.ids].all()


def test_names_of_nodes() -> None:
    report = leak_report(Graph(3, [0, 1], [1, 2])).with_ids(np.array([10, 20, 30], np.int32))
    assert report.ids.tolist() == [20, 30]


def test_nobody() -> None:
    report = leak_report(Graph(0, [], []))
    assert (report.components, report.largest, report.zeroed_count) == (0, 0, 0)
