"""The graph: rows, strong components in topological order (against networkx), what is refused."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from swaygauge.errors import InputError
from swaygauge.graph import Graph, Rows

LINKS = st.integers(1, 12).flatmap(
    lambda n: st.tuples(st.just(n), st.lists(st.tuples(st.integers(0, n - 1), st.integers(0, n - 1)), max_size=40))
)


def matrix_of(rows: Rows) -> np.ndarray:
    """matrix[row, source] = weight, by position."""
    matrix = np.zeros((rows.n, rows.n))
    for row in range(rows.n):
        links = slice(rows.start[row], rows.start[row + 1])
        assert (np.diff(rows.source[links]) > 0).all(), "sources ascend"
        matrix[row, rows.source[links]] = rows.weight[links] if len(rows.weight) else 1.0
    return matrix


@settings(max_examples=300, deadline=None, derandomize=True)
@given(LINKS, st.booleans())
def test_rows_hold_the_links(drawn: tuple[int, list[tuple[int, int]]], weighted: bool) -> None:
    n, links = drawn
    source, target = (np.array([link[side] for link in links], int) for side in (0, 1))
    weight = np.arange(1.0, len(links) + 1) if weighted else None
    graph = Graph(n, source, target, weight=weight)
    expected = np.zeros((n, n))
    if weighted:
        np.add.at(expected, (target, source), weight)
    else:
        expected[target, source] = 1.0
    by_position = expected[np.ix_(graph.order, graph.order)]
    assert np.array_equal(matrix_of(graph.rows), by_position)
    assert np.array_equal(matrix_of(graph.turned), by_position.T[::-1, ::-1])
    assert graph.m == np.count_nonzero(expected)
    assert np.array_equal(graph.in_degree(), np.count_nonzero(expected, axis=1))
    assert np.array_equal(graph.out_degree(), np.count_nonzero(expected, axis=0))
    assert np.allclose(graph.out_strength(), expected.sum(axis=0))
    assert graph.rows.sources == max([0, *(int(graph.place[u]) + 1 for u, _ in links)])


@settings(max_examples=300, deadline=None, derandomize=True)
@given(LINKS)
def test_components_are_those_of_networkx_upstream_first(drawn: tuple[int, list[tuple[int, int]]]) -> None:
    n, links = drawn
    graph = Graph(n, [u for u, _ in links], [v for _, v in links])
    peer = nx.DiGraph(links)
    peer.add_nodes_from(range(n))
    label = graph.component_of()
    mine = {frozenset(np.flatnonzero(label == c).tolist()) for c in range(graph.component_count)}
    assert mine == {frozenset(part) for part in nx.strongly_connected_components(peer)}
    assert all(label[u] <= label[v] for u, v in links)
    assert graph.component_sizes().tolist() == np.bincount(label, minlength=graph.component_count).tolist()
    assert sorted(graph.order.tolist()) == list(range(n))
    for c in range(graph.component_count):
        low, high = graph.rows.component_start[c : c + 2]
        assert set(label[graph.order[low:high]].tolist()) == {c}
        assert (np.diff(graph.out_degree()[graph.order[low:high]]) <= 0).all(), "by degree inside"


def test_long_rows_are_sorted() -> None:
    """Rows long enough for quicksort, in orders that are hard on it."""
    n = 5000
    ascending = np.arange(1, n, dtype=np.int32)
    orders = {
        "falling": ascending[::-1],
        "organ pipe": np.concatenate((ascending[::2], ascending[1::2][::-1])),
        "shuffled": np.random.default_rng(1).permutation(ascending),
        "repeated": np.tile(ascending[:100], 49),
    }
    for name, order in orders.items():
        weight = order.astype(float)
        graph = Graph(n, order, np.zeros(len(order), int), weight=weight)
        row = graph.rows.source[: graph.rows.start[-1]]
        assert (np.diff(row) > 0).all(), name
        times = len(order) // len(set(order.tolist()))
        assert np.array_equal(graph.rows.weight, times * graph.order[row].astype(float)), name


@pytest.mark.parametrize(
    ("n", "source", "target", "weight", "message"),
    [
        (3, [0, 3], [1, 1], None, "source: expected node numbers from 0 to 2, got 0 to 3"),
        (3, [0], [-1], None, "target: expected node numbers from 0 to 2, got -1 to -1"),
        (0, [0], [0], None, "expected node numbers"),
        (3, [0, 1], [1], None, "source has 2 entries and target 1"),
        (3, [0.5], [1], None, "source: expected a one-dimensional array of integers, got float64"),
        (3, [[0]], [[1]], None, "of shape"),
        (-1, [], [], None, "number of nodes: expected an integer from 0"),
        (True, [], [], None, "number of nodes"),
        (3, [0], [1], [0.0], "weight: expected finite numbers > 0, got 0.0 for link 0"),
        (3, [0, 1], [1, 2], [1.0, np.nan], "got nan for link 1"),
        (3, [0], [1], [np.inf], "got inf"),
        (3, [0], [1], [1.0, 2.0], "weight: expected 1 numbers, one per link"),
        (3, [0], [1], ["a"], "weight: expected 1 numbers"),
    ],
)
def test_what_is_refused(n: int, source: object, target: object, weight: object, message: str) -> None:
    with pytest.raises(InputError, match=message):
        Graph(n, source, target, weight=weight)  # type: ignore[arg-type]  # wrong types on purpose
