from collections.abc import Callable
from itertools import combinations

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from swaygauge.moves import kendall_tau_b, network_move, rank_biased_overlap
from swaygauge.records import ScoreSet

Maker = Callable[..., ScoreSet]
FIXED = settings(deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])


def ranked(letters: str) -> dict[int, float]:
    """Values that rank letters in the order they stand in."""
    return {ord(letter): float(len(letters) - at) for at, letter in enumerate(letters)}


def plain_overlap(first: list[int], second: list[int], p: float) -> float:
    """Webber's extrapolated overlap for lists of uneven length without ties, straight from the paper's sum (memory)."""
    short, long = sorted((first, second), key=len)
    s, n = len(short), len(long)
    shared = [len(set(long[:d]) & set(short[:d])) for d in range(1, n + 1)]
    total = sum(shared[d - 1] / d * p**d for d in range(1, n + 1))
    total += sum(shared[s - 1] * (d - s) / (s * d) * p**d for d in range(s + 1, n + 1))
    return (1 - p) / p * total + ((shared[n - 1] - shared[s - 1]) / n + shared[s - 1] / s) * p**n


def test_webbers_figure_5(score_set: Maker) -> None:
    # Webber, Moffat, Zobel 2010, figure 5: S = abcdefg, T = zcavwxy; extrapolated overlap at p = .9 computed from its
    # agreements 0 0 .667 .5 .4 .333 .286: .288217286
    move = network_move(score_set(ranked("abcdefg")), score_set(ranked("zcavwxy"), night=2), depth=7)
    assert move.overlap == pytest.approx(0.288217286, abs=1e-9)
    agreements = [0, 0, 0.667, 0.5, 0.4, 0.333, 0.286]
    for depth, agreement in enumerate(agreements, 1):
        tops = "abcdefg"[:depth], "zcavwxy"[:depth]
        at_depth = network_move(score_set(ranked(tops[0])), score_set(ranked(tops[1]), night=2), depth=depth)
        assert 1.0 - at_depth.turnover == pytest.approx(agreement, abs=0.0005)


def test_tau_b_of_scipys_documentation() -> None:
    # scipy.stats.kendalltau, documented example
    x, y = np.array([12, 2, 1, 12, 2]), np.array([1, 4, 7, 1, 0])
    assert kendall_tau_b(x, y) == pytest.approx(-0.4714045207910317, abs=1e-15)


def test_the_same_night_twice(score_set: Maker) -> None:
    scores = score_set({1: 9.0, 2: 5.0, 3: 5.0, 4: 1.0})
    move = network_move(scores, scores, depth=3, gap_nights=2)
    assert (move.turnover, move.footrule, move.gap_nights) == (0.0, 0.0, 2)
    assert move.tau_b == pytest.approx(1.0, abs=1e-15)
    assert move.overlap == pytest.approx(1.0, abs=1e-15)


@pytest.mark.parametrize("k", [1, 2, 7, 30])
def test_disjoint_tops_reach_the_limits(score_set: Maker, k: int) -> None:
    # Fagin, Kumar, Sivakumar 2003: for disjoint lists of length k the footrule with location k + 1 is k (k + 1)
    first = {node: 100.0 - node for node in range(k)}
    second = {node + 500: 100.0 - node for node in range(k)}
    move = network_move(score_set(first), score_set(second, night=2), depth=k)
    assert (move.overlap, move.turnover, move.footrule, move.tau_b) == (0.0, 1.0, 1.0, None)
    by_hand = 2 * sum(k + 1 - rank for rank in range(1, k + 1))
    assert by_hand == k * (k + 1)


@given(st.permutations(range(9)), st.permutations(range(4, 13)), st.integers(1, 9))
@FIXED
def test_footrule_by_hand(score_set: Maker, first: list[int], second: list[int], k: int) -> None:
    before = score_set({node: 100.0 - at for at, node in enumerate(first)})
    now = score_set({node: 100.0 - at for at, node in enumerate(second)}, night=2)
    first, second = first[:k], second[:k]
    places = [{node: at for at, node in enumerate(top, 1)} for top in (first, second)]
    moved = sum(abs(places[0].get(node, k + 1) - places[1].get(node, k + 1)) for node in {*first, *second})
    assert network_move(before, now, depth=k).footrule == pytest.approx(moved / (k * (k + 1)))


@given(
    st.lists(st.integers(0, 15), min_size=1, max_size=12, unique=True),
    st.lists(st.integers(0, 15), min_size=1, max_size=12, unique=True),
    st.floats(0.05, 0.98),
)
@FIXED
def test_uneven_lists_without_ties(score_set: Maker, first: list[int], second: list[int], p: float) -> None:
    before = score_set({node: 100.0 - at for at, node in enumerate(first)})
    now = score_set({node: 100.0 - at for at, node in enumerate(second)}, night=2)
    move = network_move(before, now, depth=20, persistence=p)
    assert move.overlap == pytest.approx(plain_overlap(first, second, p), abs=1e-12)


@given(
    st.dictionaries(st.integers(0, 12), st.integers(1, 4), min_size=2, max_size=12),
    st.dictionaries(st.integers(0, 12), st.integers(1, 4), min_size=2, max_size=12),
    st.integers(1, 12),
)
@FIXED
def test_ties_by_the_published_agreement(
    score_set: Maker, first: dict[int, int], second: dict[int, int], depth: int
) -> None:
    # Webber, Moffat, Zobel 2010: agreement 2 |S_d and T_d| / (|S_d| + |T_d|), tied nodes at the block's first place
    size = min(len(first), len(second))
    depth = min(depth, size)
    before = score_set({node: float(value) for node, value in first.items()})
    now = score_set({node: float(value) for node, value in second.items()}, night=2)
    tops = [[set(scores.ids[scores.rank <= d].tolist()) for d in range(1, depth + 1)] for scores in (before, now)]
    agreement = [2 * len(s & t) / (len(s) + len(t)) for s, t in zip(*tops, strict=True)]
    p = 0.9
    expected = (1 - p) / p * sum(a * p**d for d, a in enumerate(agreement, 1)) + agreement[-1] * p**depth
    assert network_move(before, now, depth=depth, persistence=p).overlap == pytest.approx(expected, abs=1e-12)


@given(st.lists(st.tuples(st.integers(1, 6), st.integers(1, 6)), min_size=2, max_size=14))
@settings(deadline=None)
def test_tau_b_by_counting_pairs(pairs: list[tuple[int, int]]) -> None:
    x, y = np.array(pairs).T
    concordant = sum(np.sign(a[0] - b[0]) * np.sign(a[1] - b[1]) for a, b in combinations(pairs, 2))
    untied = [sum(a[side] != b[side] for a, b in combinations(pairs, 2)) for side in (0, 1)]
    tau = kendall_tau_b(x, y)
    if 0 in untied:
        assert tau is None
    else:
        assert tau == pytest.approx(concordant / np.sqrt(untied[0] * untied[1]))


def test_persistence_must_be_a_share() -> None:
    rank = np.array([1, 2], np.int32)
    with pytest.raises(ValueError, match="between 0 and 1"):
        rank_biased_overlap(rank, rank, rank, rank, depth=2, persistence=1.0)
