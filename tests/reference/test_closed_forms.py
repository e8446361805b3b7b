"""Graphs whose scores are known in closed form.

Derived by hand from x = beta + alpha W'x with beta = 1; PageRank is fairshare / sum, dangling nodes spread evenly.
Common practice, no source.
"""

from __future__ import annotations

import numpy as np
import pytest

from swaygauge.graph import Graph
from swaygauge.scores.fairshare import fairshare
from swaygauge.scores.katz import katz
from swaygauge.scores.spectrum import bound_lambda

Links = list[tuple[int, int]]


def graph(n: int, links: Links) -> Graph:
    return Graph(n, [u for u, _ in links], [v for _, v in links])


def k(n: int, links: Links, alpha: float) -> np.ndarray:
    return katz(graph(n, links), alpha=alpha).value


def pr(n: int, links: Links, damping: float) -> np.ndarray:
    value = fairshare(graph(n, links), alpha=damping).value
    return value / value.sum()


def geo(z: float, last: int) -> float:
    return sum(z**i for i in range(last + 1))


def same(value: object, expected: object) -> None:
    np.testing.assert_allclose(value, expected, rtol=1e-10)


@pytest.mark.parametrize("alpha", [0.3, 1.0, 1.7])
def test_path(alpha: float) -> None:
    n, d = 9, 0.85
    links = [(i, i + 1) for i in range(n - 1)]
    same(k(n, links, alpha), [geo(alpha, i) for i in range(n)])
    total = n / (1 - d) - d * (1 - d**n) / (1 - d) ** 2
    same(pr(n, links, d), [(1 - d ** (i + 1)) / (1 - d) / total for i in range(n)])


@pytest.mark.parametrize("n", [1, 2, 7])
def test_cycle(n: int) -> None:
    links = [(i, (i + 1) % n) for i in range(n)]
    same(k(n, links, 0.6), np.full(n, 1 / 0.4))
    same(pr(n, links, 0.85), np.full(n, 1 / n))


def test_in_star() -> None:
    m, a, d = 12, 0.4, 0.85
    n, links = m + 1, [(i, 0) for i in range(1, 13)]
    same(k(n, links, a), [1 + a * m] + [1] * m)
    same(pr(n, links, d), [(1 + d * m) / (n + d * m)] + [1 / (n + d * m)] * m)


def test_out_star() -> None:
    m, a, d = 12, 0.4, 0.85
    n, links = m + 1, [(0, i) for i in range(1, 13)]
    same(k(n, links, a), [1] + [1 + a] * m)
    same(pr(n, links, d), [1 / (n + d)] + [(1 + d / m) / (n + d)] * m)


def test_two_way_star() -> None:
    m, d = 9, 0.85
    a = 0.8 / 3
    n, links = m + 1, [(0, i) for i in range(1, m + 1)] + [(i, 0) for i in range(1, m + 1)]
    hub = (1 + a * m) / (1 - a * a * m)
    same(k(n, links, a), [hub] + [1 + a * hub] * m)
    top = (1 + d * m) / (n * (1 + d))
    same(pr(n, links, d), [top] + [(1 - top) / m] * m)
    bounds = bound_lambda(graph(n, links))
    assert bounds.lower <= 3.0 <= bounds.upper
    assert bounds.upper - bounds.lower < 1e-5


def test_complete() -> None:
    n, a = 7, 0.1
    links = [(i, j) for i in range(n) for j in range(n) if i != j]
    same(k(n, links, a), np.full(n, 1 / (1 - a * (n - 1))))
    same(pr(n, links, 0.85), np.full(n, 1 / n))


def test_bipartite() -> None:
    p, q, a, d = 4, 6, 0.7, 0.85
    links = [(i, p + j) for i in range(p) for j in range(q)]
    same(k(p + q, links, a), [1] * p + [1 + a * p] * q)
    total = p + q + d * p
    same(pr(p + q, links, d), [1 / total] * p + [(1 + d * p / q) / total] * q)


@pytest.mark.parametrize("alpha", [0.5, 0.3])
def test_binary_tree(alpha: float) -> None:
    h = 5
    n, d = 2 ** (h + 1) - 1, 0.85
    depth = [(i + 1).bit_length() - 1 for i in range(n)]
    up = [(i, (i - 1) // 2) for i in range(1, n)]
    down = [(v, u) for u, v in up]
    same(k(n, up, alpha), [geo(2 * alpha, h - t) for t in depth])
    same(k(n, down, alpha), [geo(alpha, t) for t in depth])
    for links, rate, level in ((up, 2 * d, [h - t for t in depth]), (down, d / 2, depth)):
        expected = np.array([geo(rate, t) for t in level])
        same(pr(n, links, d), expected / expected.sum())


def test_transitive_tournament() -> None:
    n, a = 12, 0.9
    links = [(i, j) for i in range(n) for j in range(i + 1, n)]
    same(k(n, links, a), [(1 + a) ** j for j in range(n)])


def test_limits() -> None:
    """alpha = 0 gives beta; (x - beta) / alpha tends to the in-degree; near 1/lambda x tends to the eigenvector."""
    rng = np.random.default_rng(4)
    links = [(i, (i + 1) % 30) for i in range(30)] + [(int(u), int(v)) for u, v in rng.integers(0, 30, (90, 2))]
    net = graph(30, links)
    assert np.array_equal(katz(net, alpha=0.0, beta=2.0).value, np.full(30, 2.0))
    np.testing.assert_allclose((katz(net, alpha=1e-6).value - 1) / 1e-6, net.in_degree(), rtol=1e-4)
    bounds = bound_lambda(net, gap=1e-13)
    near = katz(net, alpha=(1 - 1e-7) / bounds.upper).value
    matrix = np.zeros((30, 30))
    matrix[[u for u, _ in links], [v for _, v in links]] = 1
    values, vectors = np.linalg.eig(matrix.T)
    leading = np.abs(vectors[:, np.argmax(values.real)].real)
    np.testing.assert_allclose(near / np.linalg.norm(near), leading, rtol=1e-5)
