"""Networks that break solvers: long, wide, periodic, tied, badly scaled."""

from __future__ import annotations

import numpy as np
import pytest

from swaygauge.errors import NotConverged
from swaygauge.graph import Graph
from swaygauge.records import Floats
from swaygauge.scores.fairshare import fairshare
from swaygauge.scores.katz import katz
from swaygauge.scores.leaks import leak_report
from swaygauge.scores.ranks import proven_places
from swaygauge.scores.spectrum import bound_lambda, leading_vectors

MILLION = 1_000_000


def ring(n: int, *, weight: Floats | None = None) -> Graph:
    nodes = np.arange(n)
    return Graph(n, nodes, (nodes + 1) % n, weight=weight)


def test_a_path_of_a_million_nodes() -> None:
    graph = Graph(MILLION, np.arange(MILLION - 1), np.arange(1, MILLION))
    assert graph.component_count == MILLION
    bounds = bound_lambda(graph)
    assert (bounds.lower, bounds.upper, bounds.component) == (0.0, 0.0, -1)
    solution = katz(graph, alpha=0.5)
    np.testing.assert_allclose(solution.value, 2.0 - 0.5 ** np.arange(MILLION), rtol=1e-13)
    at_one = katz(graph, alpha=1.0)  # legal without a cycle; closed form 1, 2, 3, ...
    assert np.all(np.abs(at_one.value - np.arange(1, MILLION + 1)) <= at_one.bound)
    assert leak_report(graph, bounds=bounds).zeroed_count == MILLION - 1


def test_a_path_whose_values_leave_the_range_of_floats() -> None:
    graph = Graph(5000, np.arange(4999), np.arange(1, 5000))
    with pytest.raises(NotConverged, match="Use a smaller alpha"):
        katz(graph, alpha=2.0)


def test_a_star_of_a_million_leaves() -> None:
    leaves = np.arange(1, MILLION + 1)
    into = Graph(MILLION + 1, leaves, np.zeros(MILLION, int))
    solution = katz(into, alpha=0.25)
    assert solution.value[0] == 1 + 0.25 * MILLION
    assert solution.bound[0] <= 1e-13 * solution.value[0]
    out = Graph(MILLION + 1, np.zeros(MILLION, int), leaves)
    np.testing.assert_allclose(fairshare(out).value[1:], 1 + 0.85 / MILLION, rtol=1e-14)


@pytest.mark.parametrize("n", [2, 3, 1000, 100_000])
def test_periodic_rings(n: int) -> None:
    graph = ring(n)
    bounds = bound_lambda(graph)
    assert bounds.lower <= 1.0 <= bounds.upper
    assert bounds.upper - bounds.lower <= 1e-6
    solution = katz(graph, alpha=0.999)
    assert np.all(np.abs(solution.value - 1000.0) <= solution.bound)
    np.testing.assert_allclose(solution.value, 1000.0, rtol=1e-9)


@pytest.mark.parametrize("n", [2, 7, 300, 2000])
def test_rings_with_weights_over_eighteen_orders(n: int) -> None:
    weight = 10.0 ** np.random.default_rng(n).uniform(-9, 9, n)
    bounds = bound_lambda(ring(n, weight=weight))
    mean = float(np.exp(np.log(weight).mean()))  # the radius of a cycle is the geometric mean of its weights
    assert bounds.lower <= mean * (1 + 1e-12)
    assert bounds.upper >= mean * (1 - 1e-12)
    assert bounds.upper - bounds.lower <= 1e-6 * bounds.lower


def test_two_nodes_with_a_self_link() -> None:
    """Matrix [[1, 1], [1, 0]]: lambda is the golden ratio."""
    graph = Graph(2, [0, 0, 1], [0, 1, 0])
    golden = (1 + 5**0.5) / 2
    bounds = bound_lambda(graph)
    assert bounds.lower <= golden <= bounds.upper
    alpha = 0.999 / bounds.upper
    expected = np.linalg.solve(np.eye(2) - alpha * np.array([[1.0, 1.0], [1.0, 0.0]]), np.ones(2))
    np.testing.assert_allclose(katz(graph, alpha=alpha).value, expected, rtol=1e-10)


def test_one_node_with_a_self_link() -> None:
    graph = Graph(1, [0], [0], weight=[3.0])
    assert bound_lambda(graph).lower == bound_lambda(graph).upper == 3.0
    assert katz(graph, alpha=0.25).value[0] == pytest.approx(4.0, rel=1e-12)


def test_several_equal_components_in_a_row() -> None:
    """Two rings of the same radius, one feeding the other: score still has a value, the eigenvector sits downstream."""
    links = [(0, 1), (1, 0), (1, 2), (2, 3), (3, 2), (3, 4)]
    graph = Graph(5, [u for u, _ in links], [v for _, v in links])
    vectors = leading_vectors(graph)
    np.testing.assert_allclose(vectors.right, [0, 0, 1, 1, 1], atol=1e-9)
    np.testing.assert_allclose(vectors.left, [1, 1, 0, 0, 0], atol=1e-9)
    report = leak_report(graph)
    assert report.zeroed_count == 2
    assert report.ids.tolist() == [0, 1]
    solution = katz(graph, alpha=0.999)
    matrix = np.zeros((5, 5))
    matrix[[u for u, _ in links], [v for _, v in links]] = 1
    exact = np.linalg.solve(np.eye(5) - 0.999 * matrix.T, np.ones(5))
    np.testing.assert_allclose(solution.value, exact, rtol=1e-9)


def test_a_component_whose_degrees_promise_more_than_it_holds() -> None:
    """A self-link that is lambda, beside a component whose row sums equal lambda while its radius does not."""
    links = [(0, 0, 2.0), (1, 2, 2.0), (2, 1, 0.5), (3, 1, 1.0)]
    graph = Graph(4, *(np.array([link[side] for link in links]) for side in (0, 1)), weight=[w for *_, w in links])
    bounds = bound_lambda(graph)
    assert (bounds.lower, bounds.upper) == (2.0, 2.0)
    np.testing.assert_allclose(leading_vectors(graph).right, [1, 0, 0, 0], atol=1e-12)


def test_many_equal_components() -> None:
    """A thousand rings of three with a chord: none stands out, all are proven."""
    base = np.repeat(3 * np.arange(1000), 4)
    graph = Graph(3000, base + np.tile([0, 1, 2, 1], 1000), base + np.tile([1, 2, 0, 0], 1000))
    bounds = bound_lambda(graph)
    exact = float(np.max(np.roots([1, 0, -1, -1]).real))  # of x^3 = x + 1
    assert bounds.lower <= exact * (1 + 1e-12)
    assert exact * (1 - 1e-12) <= bounds.upper <= exact * (1 + 2e-6)


def test_a_two_way_path_near_its_limit() -> None:
    """Diffusion: neighbouring eigenvalues lie close together and only many sweeps get across."""
    n = 2000
    nodes = np.arange(n - 1)
    graph = Graph(n, np.concatenate((nodes, nodes + 1)), np.concatenate((nodes + 1, nodes)))
    radius = 2 * np.cos(np.pi / (n + 1))  # of the path on n nodes
    bounds = bound_lambda(graph)
    assert bounds.lower <= radius <= bounds.upper
    alpha = 0.999 / 2
    solution = katz(graph, alpha=alpha)
    from scipy.linalg import solve_banded

    bands = np.vstack((np.full(n, -alpha), np.ones(n), np.full(n, -alpha)))
    exact = solve_banded((1, 1), bands, np.ones(n))
    assert np.all(np.abs(solution.value - exact) <= solution.bound + 1e-11 * exact)
    np.testing.assert_allclose(solution.value, exact, rtol=1e-9)


def test_values_so_large_that_beta_is_below_their_rounding() -> None:
    """A chain of heavy links lifts values by 1e45: proven by the spectral bounds, not by the values."""
    links = [(0, 1), (1, 0), (1, 2), (2, 3), (3, 4), (4, 5)]
    weight = [1.0, 1.0, 1e9, 1e9, 1e9, 1e9]
    graph = Graph(6, [u for u, _ in links], [v for _, v in links], weight=weight)
    solution = katz(graph, alpha=0.5)
    exact = [2.0, 2.0]
    for heavy in weight[2:]:
        exact.append(1 + 0.5 * heavy * exact[-1])
    assert np.all(np.abs(solution.value - exact) <= solution.bound)
    assert np.all(solution.bound <= 1e-12 * solution.value)


def test_only_as_many_places_as_can_be_told() -> None:
    rng = np.random.default_rng(3)
    source, target = rng.integers(0, 400, 2400), (400 * rng.random(2400) ** 2).astype(int)
    graph = Graph(400, source, target)
    loose = katz(graph, alpha=0.01, tolerance=1e-2)
    assert proven_places(loose.value, loose.bound) < 300
    proven = katz(graph, alpha=0.01, tolerance=1e-2, places=300)
    assert proven_places(proven.value, proven.bound) >= 300
    assert proven.bound.max() < loose.bound.max()
    twins = Graph(4, [0, 1], [2, 3], weight=[1.0, 1.0 + 2**-49])
    with pytest.raises(NotConverged, match=r"only the first 0 places could be proven.*asked for 4"):
        katz(twins, alpha=0.3, places=4)
