"""The adjoint against dense linear algebra, and the identity it is for."""

from __future__ import annotations

import numpy as np
import pytest

from swaygauge.errors import ScoreError
from swaygauge.graph import Graph
from swaygauge.scores.adjoint import solve_adjoint
from swaygauge.scores.fairshare import fairshare
from swaygauge.scores.katz import katz
from swaygauge.scores.spectrum import bound_lambda


def random_links(seed: int, n: int = 150, m: int = 700) -> tuple[int, np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    keys = np.unique((n * rng.random(m) ** 1.5).astype(int) * n + (n * rng.random(m) ** 2).astype(int))
    return n, keys // n, keys % n, rng.uniform(0.2, 3.0, len(keys))


def dense(n: int, source: np.ndarray, target: np.ndarray, weight: np.ndarray, score: str) -> np.ndarray:
    matrix = np.zeros((n, n))
    matrix[source, target] = weight
    if score == "fairshare":
        out = matrix.sum(axis=1, keepdims=True)
        matrix = np.divide(matrix, out, out=np.zeros_like(matrix), where=out > 0)
    return matrix


@pytest.mark.parametrize("score", ["katz", "fairshare"])
@pytest.mark.parametrize("weighted", [False, True])
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_against_a_dense_solve(score: str, weighted: bool, seed: int) -> None:
    n, source, target, weight = random_links(seed)
    graph = Graph(n, source, target, weight=weight if weighted else None)
    alpha = 0.85 if score == "fairshare" else 0.9 / bound_lambda(graph).upper
    matrix = dense(n, source, target, weight if weighted else np.ones(len(source)), score)
    x = (fairshare(graph, alpha=alpha) if score == "fairshare" else katz(graph, alpha=alpha)).value
    right = np.eye(n)[:, [int(x.argmax()), 0, 7, int(x.argmin())]]
    adjoint = solve_adjoint(graph, score, right, alpha=alpha, values=x, tolerance=1e-12)
    np.testing.assert_allclose(adjoint.value, np.linalg.solve(np.eye(n) - alpha * matrix, right), rtol=1e-8, atol=1e-11)
    residual = right + alpha * matrix @ adjoint.value - adjoint.value
    np.testing.assert_allclose(adjoint.residual, residual, atol=1e-13)
    np.testing.assert_allclose(adjoint.value.sum(axis=0), right.T @ x, rtol=1e-9)  # y . beta is the score
    one = solve_adjoint(graph, score, right[:, 0], alpha=alpha, values=x, tolerance=1e-12)
    assert np.array_equal(one.value, adjoint.value[:, 0])


def test_the_residual_is_exactly_what_is_unaccounted() -> None:
    """Changed links account for a difference of scores up to residual . difference, however loose the solve."""
    n, source, target, _ = random_links(4)
    keep = np.random.default_rng(5).random(len(source)) > 0.1
    before, now = Graph(n, source[keep], target[keep]), Graph(n, source, target)
    alpha = 0.8 / bound_lambda(now).upper
    x, y = katz(before, alpha=alpha, tolerance=1e-15).value, katz(now, alpha=alpha, tolerance=1e-15).value
    w = int(y.argmax())
    for tolerance in (0.3, 1e-3, 1e-10):
        adjoint = solve_adjoint(now, "katz", np.eye(n)[w], alpha=alpha, values=y, tolerance=tolerance)
        gained = float(np.sum(alpha * adjoint.value[target[~keep]] * x[source[~keep]]))
        unaccounted = float(adjoint.residual @ (y - x))
        assert gained + unaccounted == pytest.approx(y[w] - x[w], rel=1e-11)


@pytest.mark.parametrize(
    ("named", "message"),
    [
        ({"score": "fame"}, "expected 'katz' or 'fairshare', got 'fame'"),
        ({"right": [1.0]}, "right: expected 3 finite numbers"),
        ({"right": [1.0, -1.0, 0.0]}, "right: expected 3 finite numbers >= 0"),
        ({"values": [1.0]}, "values: expected 3 numbers"),
    ],
)
def test_what_is_refused(named: dict[str, object], message: str) -> None:
    usual: dict[str, object] = {"score": "katz", "right": [0.0, 0.0, 1.0], "values": None}
    with pytest.raises(ScoreError, match=message):
        solve_adjoint(Graph(3, [0, 1], [1, 2]), alpha=0.5, **(usual | named))  # type: ignore[arg-type]  # wrong types on purpose
