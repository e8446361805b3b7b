"""Scores on random digraphs against dense linear algebra (NumPy / LAPACK) and igraph's PageRank (PRPACK)."""

from __future__ import annotations

import igraph
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from swaygauge.errors import AlphaTooLarge
from swaygauge.graph import Graph
from swaygauge.scores.fairshare import fairshare
from swaygauge.scores.katz import katz
from swaygauge.scores.ranks import rank_places
from swaygauge.scores.solution import Solution
from swaygauge.scores.spectrum import bound_lambda, leading_vectors

Dense = np.ndarray
MANY = settings(max_examples=120, deadline=None, derandomize=True)


@st.composite
def digraphs(draw: st.DrawFn, *, weights: tuple[float, float] | None = None) -> tuple[Graph, Dense]:
    """(graph, matrix) with matrix[u, v] = weight of u -> v."""
    n = draw(st.integers(1, 30))
    density = draw(st.sampled_from([0.5, 1.5, 4.0]))
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    m = rng.poisson(density * n)
    source, target = rng.integers(0, n, m), (n * rng.random(m) ** rng.choice([1.0, 3.0])).astype(int)
    matrix = np.zeros((n, n))
    if weights is None:
        matrix[source, target] = 1.0
        return Graph(n, source, target), matrix
    weight = 10.0 ** rng.uniform(*np.log10(weights), m)
    np.add.at(matrix, (source, target), weight)
    return Graph(n, source, target, weight=weight), matrix


def refined(matrix: Dense, beta: Dense) -> np.ndarray:
    """Solution of (I - matrix') x = beta, refined in extended precision."""
    system = np.eye(len(beta), dtype=np.longdouble) - matrix.T
    x = np.zeros(len(beta), np.longdouble)
    for _ in range(6):
        x += np.linalg.solve(system.astype(float), (beta - system @ x).astype(float))
    return x


def check_contains(solution: Solution, exact: np.ndarray) -> None:
    # the reference itself is good to about 1e-17 of its largest entry
    assert np.all(np.abs(solution.value - exact) <= solution.bound + 1e-17 * np.abs(exact).max())


def shares(matrix: Dense) -> np.ndarray:
    out = matrix.sum(axis=1, keepdims=True).astype(np.longdouble)
    return np.divide(matrix, out, out=np.zeros(matrix.shape, np.longdouble), where=out > 0)


@MANY
@given(digraphs(), st.sampled_from([0.5, 0.85, 0.95, 0.999]))
def test_katz_bounds_contain_the_dense_solution(drawn: tuple[Graph, Dense], share: float) -> None:
    graph, matrix = drawn
    upper = bound_lambda(graph).upper
    alpha = share / upper if upper else 0.5
    solution = katz(graph, alpha=alpha)
    exact = refined(np.longdouble(alpha) * matrix, np.ones(graph.n))
    check_contains(solution, exact)
    np.testing.assert_allclose(solution.value, exact.astype(float), rtol=1e-9)
    assert np.all(solution.bound <= 1e-9 * solution.value)


@MANY
@given(digraphs(weights=(1e-9, 1e9)), st.sampled_from([0.5, 0.85, 0.95]))
def test_katz_with_weights_over_eighteen_orders(drawn: tuple[Graph, Dense], share: float) -> None:
    graph, matrix = drawn
    upper = bound_lambda(graph).upper
    alpha = share / upper if upper else 1e-9
    solution = katz(graph, alpha=alpha)
    check_contains(solution, refined(np.longdouble(alpha) * matrix, np.ones(graph.n)))
    assert np.all(solution.bound <= 1e-6 * solution.value)


@MANY
@given(digraphs(weights=(0.1, 10.0)), st.integers(0, 2**32 - 1))
def test_fairshare_bounds_contain_the_dense_solution(drawn: tuple[Graph, Dense], seed: int) -> None:
    graph, matrix = drawn
    rng = np.random.default_rng(seed)
    beta = rng.uniform(0.1, 3.0, graph.n)
    if seed % 3 == 0:
        beta[rng.random(graph.n) < 0.6] = 0.0
        beta[0] = 1.0
    solution = fairshare(graph, beta=beta)
    check_contains(solution, refined(np.longdouble(0.85) * shares(matrix), beta))


@MANY
@given(digraphs(), st.sampled_from([0.5, 0.85, 0.99]))
def test_fairshare_is_pagerank(drawn: tuple[Graph, Dense], damping: float) -> None:
    graph, matrix = drawn
    value = fairshare(graph, alpha=damping).value
    peer = igraph.Graph(n=graph.n, edges=np.argwhere(matrix > 0).tolist(), directed=True)
    expected = peer.personalized_pagerank(damping=damping, implementation="prpack")
    np.testing.assert_allclose(value / value.sum(), expected, rtol=1e-9)


@MANY
@given(digraphs(weights=(0.01, 100.0)))
def test_lambda_is_enclosed(drawn: tuple[Graph, Dense]) -> None:
    graph, matrix = drawn
    bounds = bound_lambda(graph)
    exact = float(np.abs(np.linalg.eigvals(matrix)).max())
    if bounds.upper == 0.0:  # a nilpotent matrix: LAPACK sees the n-th root of its rounding
        assert not np.linalg.matrix_power((matrix > 0).astype(float), graph.n).any()
        return
    assert bounds.lower * (1 - 1e-9) <= exact <= bounds.upper * (1 + 1e-9)
    assert bounds.upper - bounds.lower <= 1e-6 * bounds.lower


@MANY
@given(digraphs(weights=(0.1, 10.0)))
def test_leading_vectors(drawn: tuple[Graph, Dense]) -> None:
    graph, matrix = drawn
    bounds, vectors = bound_lambda(graph, gap=1e-9), leading_vectors(graph)
    assert (vectors.right >= 0).all()
    assert (vectors.left >= 0).all()
    if bounds.upper == 0.0:
        assert vectors.component == -1
        assert not vectors.right.any()
        return
    assert vectors.right.max() == vectors.left.max() == 1.0
    assert np.abs(matrix.T @ vectors.right - bounds.upper * vectors.right).max() <= 1e-6 * bounds.upper
    assert np.abs(matrix @ vectors.left - bounds.upper * vectors.left).max() <= 1e-6 * bounds.upper


@MANY
@given(digraphs())
def test_alpha_at_or_above_one_over_lambda_is_refused(drawn: tuple[Graph, Dense]) -> None:
    graph, _ = drawn
    bounds = bound_lambda(graph)
    if bounds.upper == 0.0:
        return
    for alpha in (1.0 / bounds.lower, 1.3 / bounds.lower, 50.0 / bounds.lower):
        with pytest.raises(AlphaTooLarge) as caught:
            katz(graph, alpha=alpha)
        assert f"Use alpha < {caught.value.largest_safe:.12g}" in str(caught.value)
        assert caught.value.largest_safe * bounds.upper <= 1.0
        katz(graph, alpha=caught.value.largest_safe * 0.999)


@MANY
@given(digraphs(), st.integers(0, 2**32 - 1), st.sampled_from(["katz", "fairshare"]))
def test_a_new_link_never_lowers_its_target(drawn: tuple[Graph, Dense], seed: int, score: str) -> None:
    """Score and rank monotonicity: Boldi, Luongo, Vigna 2017, "Rank monotonicity in centrality measures", Network
    Science 5(4), for Katz and PageRank with beta > 0."""
    graph, matrix = drawn
    rng = np.random.default_rng(seed)
    u, v = (int(i) for i in rng.integers(0, graph.n, 2))
    more = matrix.copy()
    more[u, v] = 1.0
    after = Graph(graph.n, *np.nonzero(more))
    upper = bound_lambda(after).upper
    alpha = 0.9 / upper if upper else 0.5
    x, y = (katz(g, alpha=alpha) if score == "katz" else fairshare(g) for g in (graph, after))
    assert y.value[v] >= x.value[v] - x.bound[v] - y.bound[v]
    if score == "katz":
        assert np.all(y.value >= x.value - x.bound - y.bound)
    best, worst = rank_places(x.value, x.bound)[1:]
    new_best, _ = rank_places(y.value, y.bound)[1:]
    assert new_best[v] <= worst[v]
    # whoever was proven to stand below the target stands below it still
    below = x.value + x.bound < x.value[v] - x.bound[v]
    assert np.all(y.value[below] - y.bound[below] < y.value[v] + y.bound[v])
    assert best[v] <= worst[v]


@MANY
@given(digraphs(weights=(0.1, 10.0)), st.floats(0.01, 100.0))
def test_scaling_of_weights(drawn: tuple[Graph, Dense], factor: float) -> None:
    """katz is unchanged when weights x c and alpha / c; fairshare when one node's out-weights are scaled."""
    graph, matrix = drawn
    source, target = np.nonzero(matrix)
    weight = matrix[source, target]
    upper = bound_lambda(graph).upper
    alpha = 0.8 / upper if upper else 0.5
    scaled = Graph(graph.n, source, target, weight=weight * factor)
    one, other = katz(graph, alpha=alpha), katz(scaled, alpha=alpha / factor)
    np.testing.assert_allclose(one.value, other.value, rtol=1e-9)
    row = Graph(graph.n, source, target, weight=np.where(source == 0, weight * factor, weight))
    np.testing.assert_allclose(fairshare(graph).value, fairshare(row).value, rtol=1e-9)
