"""Ranks and places against a quadratic count of the definition."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from swaygauge.scores.ranks import proven_places, rank_places

LISTS = st.lists(st.tuples(st.integers(1, 9), st.sampled_from([0.01, 0.4, 0.6, 1.3])), max_size=12)


@settings(max_examples=500, deadline=None, derandomize=True)
@given(LISTS)
def test_the_definition_where_bounds_are_equal(drawn: list[tuple[int, float]]) -> None:
    value = np.array([v for v, _ in drawn], float)
    bound = np.full(len(value), 0.6)
    rank, best, worst = rank_places(value, bound)
    for w in range(len(value)):
        larger = sum(value[v] - bound[v] > value[w] + bound[w] for v in range(len(value)))
        not_smaller = sum(value[v] + bound[v] >= value[w] - bound[w] for v in range(len(value)))
        assert (rank[w], best[w], worst[w]) == (larger + 1, larger + 1, not_smaller)


@settings(max_examples=500, deadline=None, derandomize=True)
@given(LISTS)
def test_places_contain_every_consistent_order(drawn: list[tuple[int, float]]) -> None:
    """Whatever the exact values inside the bounds are, each node's competition place lies between best and worst."""
    value, bound = np.array([v for v, _ in drawn], float), np.array([b for _, b in drawn], float)
    rank, best, worst = rank_places(value, bound)
    rng = np.random.default_rng(len(drawn))
    for _ in range(20):
        exact = value + bound * rng.choice([-1.0, -0.5, 0.0, 0.5, 1.0], len(value))
        place = np.array([1 + np.count_nonzero(exact > own) for own in exact], int)
        assert np.all(best <= place)
        assert np.all(place <= worst)
    for a in range(len(value)):
        for b in range(len(value)):
            if value[a] == value[b]:
                assert (rank[a], best[a], worst[a]) == (rank[b], best[b], worst[b])
            if value[a] > value[b]:
                assert rank[a] <= rank[b]


@settings(max_examples=300, deadline=None, derandomize=True)
@given(LISTS)
def test_proven_places_are_in_order(drawn: list[tuple[int, float]]) -> None:
    value, bound = np.array([v for v, _ in drawn], float), np.array([b for _, b in drawn], float)
    proven = proven_places(value, bound)
    order = np.argsort(-value, kind="stable")
    for i, a in enumerate(order[:proven]):
        for b in order[i + 1 :]:
            assert value[a] == value[b] or value[a] - bound[a] > value[b] + bound[b]


def test_nobody_and_one() -> None:
    assert [len(places) for places in rank_places(np.empty(0), np.empty(0))] == [0, 0, 0]
    assert [places.tolist() for places in rank_places(np.array([3.0]), np.array([0.1]))] == [[1], [1], [1]]
    assert proven_places(np.empty(0), np.empty(0)) == 0
