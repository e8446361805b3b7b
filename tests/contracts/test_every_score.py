"""What every score promises; a new one in SCORES is found by itself."""

from __future__ import annotations

import dataclasses
from typing import get_type_hints

import numpy as np
import pytest

from swaygauge.errors import ScoreError
from swaygauge.graph import Graph
from swaygauge.scores import SCORES, Score, Solution

EVERY = pytest.mark.parametrize("score", SCORES.values(), ids=list(SCORES))
Links = tuple[int, np.ndarray, np.ndarray, np.ndarray]


def links_of(seed: int, n: int = 60, m: int = 260) -> Links:
    """A small random network; the first nodes are endorsed most."""
    rng = np.random.default_rng(seed)
    source = rng.integers(0, n, m).astype(np.int32)
    target = (n * rng.random(m) ** 2).astype(np.int32)
    keys = np.unique(source.astype(np.int64) * n + target)
    return n, (keys // n).astype(np.int32), (keys % n).astype(np.int32), rng.uniform(0.1, 4.0, len(keys))


def solve(score: Score, graph: Graph, **named: object) -> Solution:
    return score.solve(graph, options=score.options(), alpha=0.02, **named)  # type: ignore[arg-type]  # each score has its own options


@EVERY
def test_name_and_options(score: Score) -> None:
    assert SCORES[score.name] is score
    assert score.summary
    assert {"beta", "tolerance"} <= {field.name for field in dataclasses.fields(score.options)}
    allowed = {float, int, str, bool}
    assert set(get_type_hints(score.options).values()) <= allowed, "only types that TOML has"


@EVERY
@pytest.mark.parametrize("weighted", [False, True])
def test_any_order_of_links_gives_the_same_bytes(score: Score, weighted: bool) -> None:
    n, source, target, weight = links_of(1)
    first = solve(score, Graph(n, source, target, weight=weight if weighted else None))
    shuffle = np.random.default_rng(2).permutation(len(source))
    other = solve(score, Graph(n, source[shuffle], target[shuffle], weight=weight[shuffle] if weighted else None))
    assert first.value.tobytes() == other.value.tobytes()
    assert first.bound.tobytes() == other.bound.tobytes()


@EVERY
def test_repeated_links_count_once_or_add_up(score: Score) -> None:
    n, source, target, weight = links_of(3)
    twice = [np.concatenate((side, side)) for side in (source, target)]
    assert np.array_equal(solve(score, Graph(n, source, target)).value, solve(score, Graph(n, *twice)).value)
    halves = Graph(n, *twice, weight=np.concatenate((weight / 2, weight / 2)))
    assert np.array_equal(solve(score, Graph(n, source, target, weight=weight)).value, solve(score, halves).value)


@EVERY
def test_relabelled_nodes_give_relabelled_scores(score: Score) -> None:
    n, source, target, weight = links_of(4)
    names = np.random.default_rng(5).permutation(n).astype(np.int32)
    first = solve(score, Graph(n, source, target, weight=weight))
    other = solve(score, Graph(n, names[source], names[target], weight=weight))
    assert np.all(np.abs(first.value - other.value[names]) <= first.bound + other.bound[names])


@EVERY
def test_inputs_are_left_alone(score: Score) -> None:
    n, source, target, weight = links_of(6)
    beta = np.linspace(0.5, 2.0, n)
    given = [array.copy() for array in (source, target, weight, beta)]
    solve(score, Graph(n, source, target, weight=weight), beta=beta, start=beta)
    for before, after in zip(given, (source, target, weight, beta), strict=True):
        assert np.array_equal(before, after)


@EVERY
def test_read_only_inputs_are_welcome(score: Score) -> None:
    n, source, target, weight = links_of(7)
    plain = solve(score, Graph(n, source, target, weight=weight))
    for array in (source, target, weight):
        array.setflags(write=False)
    assert np.array_equal(solve(score, Graph(n, source, target, weight=weight)).value, plain.value)


@EVERY
@pytest.mark.parametrize("n", [0, 1, 2])
def test_tiny_networks_without_links(score: Score, n: int) -> None:
    solution = solve(score, Graph(n, [], []), beta=2.0)
    assert solution.value.tolist() == [2.0] * n
    assert solution.bound.shape == (n,)


@EVERY
def test_values_are_finite_at_least_beta_and_proven_to_tolerance(score: Score) -> None:
    n, source, target, _ = links_of(8)
    solution = solve(score, Graph(n, source, target), beta=3.0)
    assert np.isfinite(solution.value).all()
    assert np.isfinite(solution.bound).all()
    assert (solution.value >= 3.0 - solution.bound).all()
    assert solution.residual <= score.options().tolerance
    assert (solution.bound <= 1e-8 * solution.value).all()


@EVERY
def test_linear_in_beta(score: Score) -> None:
    n, source, target, _ = links_of(9)
    graph = Graph(n, source, target)
    rng = np.random.default_rng(10)
    one, two = rng.random(n) + 0.1, rng.random(n) + 0.1
    parts = solve(score, graph, beta=one), solve(score, graph, beta=two)
    whole = solve(score, graph, beta=one + two)
    slack = parts[0].bound + parts[1].bound + whole.bound + 1e-14 * whole.value
    assert np.all(np.abs(parts[0].value + parts[1].value - whole.value) <= slack)


@EVERY
def test_a_start_changes_the_work_and_not_the_answer(score: Score) -> None:
    n, source, target, _ = links_of(11)
    graph = Graph(n, source, target)
    cold = solve(score, graph)
    warm = solve(score, graph, start=cold.value)
    assert np.all(np.abs(cold.value - warm.value) <= cold.bound + warm.bound)


@EVERY
@pytest.mark.parametrize(
    ("beta", "message"),
    [
        (-1.0, "expected finite numbers >= 0, got -1.0 for node 0"),
        (np.nan, "got nan"),
        (0.0, "at least one node"),
        (np.ones(3), "expected one number or 60"),
    ],
)
def test_impossible_beta_is_refused(score: Score, beta: object, message: str) -> None:
    n, source, target, _ = links_of(12)
    with pytest.raises(ScoreError, match=message):
        solve(score, Graph(n, source, target), beta=beta)


@EVERY
@pytest.mark.parametrize("bad", [np.ones(3), np.full(60, np.inf)])
def test_impossible_start_is_refused(score: Score, bad: np.ndarray) -> None:
    n, source, target, _ = links_of(12)
    with pytest.raises(ScoreError, match="start: expected 60 finite numbers"):
        solve(score, Graph(n, source, target), start=bad)


@EVERY
def test_a_disjoint_network_beside_changes_nothing(score: Score) -> None:
    n, source, target, _ = links_of(13)
    alone = solve(score, Graph(n, source, target))
    ring = np.arange(5, dtype=np.int32) + n
    beside = Graph(n + 5, np.concatenate((source, ring)), np.concatenate((target, np.roll(ring, 1))))
    together = solve(score, beside)
    assert np.all(np.abs(together.value[:n] - alone.value) <= together.bound[:n] + alone.bound)
