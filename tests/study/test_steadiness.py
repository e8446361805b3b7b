"""Crawl noise against exact enumeration, dense matrices and resampling."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from study import dense

from swaygauge.errors import ScoreError
from swaygauge.records import Floats
from swaygauge.scores.ranks import rank_places
from swaygauge.study.resampling import NORMAL, Check, resample
from swaygauge.study.steadiness import Noise, Push, Reach, crawl_noise

SCORES = pytest.mark.parametrize("score", ["katz", "fairshare"])
SMALL: dense.Links = [  # ten links: a ring, chords, a heavy link, a source of one link, an unendorsed source
    (0, 1, 1.0),
    (1, 2, 1.0),
    (2, 0, 1.0),
    (0, 2, 3.0),
    (3, 1, 1.0),
    (4, 0, 1.0),
    (4, 3, 2.0),
    (2, 3, 1.0),
    (5, 4, 1.0),
    (5, 1, 1.0),
]
NODES = 6


def exact_losses(score: str, alpha: float, n: int, links: dense.Links) -> Floats:
    """(m, n): what each link's absence alone takes from the own importance of every node, from dense matrices."""
    x, whole = dense.solve(score, alpha, n, links), dense.matrix(score, n, links)
    rows = [whole - dense.matrix(score, n, links[:at] + links[at + 1 :]) for at in range(len(links))]
    return np.array([alpha * (row.T @ x) for row in rows])


def pushed(score: str, alpha: float, n: int, links: dense.Links) -> tuple[Push, list[int]]:
    """The push, and where each link of ``links`` stands in it."""
    graph = dense.graph_of(n, links)
    value = dense.solve(score, alpha, n, links)
    push = Push.of(graph, dense.setting(score, alpha), value)
    there = {
        pair: at for at, pair in enumerate(zip(push.links.source.tolist(), push.links.target.tolist(), strict=True))
    }
    return push, [there[source, target] for source, target, _ in links]


@SCORES
@settings(deadline=None)
@given(network=dense.networks())
def test_what_one_missed_link_takes(score: str, network: tuple[int, dense.Links]) -> None:
    n, links = network
    alpha = dense.legal_alpha(score, n, links, 0.8)
    push, at = pushed(score, alpha, n, links)
    one_at_a_time = np.array([push.change(np.eye(len(links))[position]) for position in at])
    np.testing.assert_allclose(one_at_a_time, exact_losses(score, alpha, n, links), rtol=1e-9, atol=1e-9)


@SCORES
def test_mean_over_all_signs_is_the_sum_of_squares(score: str) -> None:
    alpha = dense.legal_alpha(score, NODES, SMALL, 0.8)
    graph, setting = dense.graph_of(NODES, SMALL), dense.setting(score, alpha)
    push, _ = pushed(score, alpha, NODES, SMALL)
    r = dense.reach(score, alpha, NODES, SMALL)
    exact = ((exact_losses(score, alpha, NODES, SMALL) @ r.T) ** 2).sum(axis=0)
    signs = itertools.product((-1.0, 1.0), repeat=len(SMALL))
    squares = [(r @ push.change(np.array(sign))) ** 2 for sign in signs]
    np.testing.assert_allclose(np.mean(squares, axis=0), exact, rtol=1e-9)
    sign = np.array([1.0, -1.0] * 5)
    x = dense.solve(score, alpha, NODES, SMALL)
    ours = Reach(graph, setting, x, options=dense.OPTIONS[score]).of(push.change(sign))
    np.testing.assert_allclose(ours, r @ push.change(sign), rtol=1e-8, atol=1e-8)


ACYCLIC: dense.Links = [  # no way back to a link's own source, so one missed link acts exactly as the first order says
    (0, 1, 1.0),
    (0, 2, 3.0),
    (1, 2, 1.0),
    (1, 3, 2.0),
    (2, 3, 1.0),
    (4, 0, 1.0),
    (4, 2, 2.0),
    (5, 4, 1.0),
    (5, 1, 1.0),
    (5, 3, 1.0),
]


def enumerated(score: str, alpha: float, rate: float) -> tuple[Floats, Floats]:
    """Exact mean and variance of every value, over all 2^10 sets of missed links with their probabilities."""
    whole = dense.solve(score, alpha, NODES, ACYCLIC)
    mean, square = np.zeros(NODES), np.zeros(NODES)  # of the change
    for missed in itertools.product((False, True), repeat=len(ACYCLIC)):
        probability = np.prod([rate if gone else 1.0 - rate for gone in missed])
        left = [link for link, gone in zip(ACYCLIC, missed, strict=True) if not gone]
        change = dense.solve(score, alpha, NODES, left) - whole
        mean += probability * change
        square += probability * change**2
    return mean, square - mean**2


@SCORES
def test_noise_is_the_exact_one_at_a_small_rate(score: str) -> None:
    """Brute force over every set of missed links; the delta method is its first order in the rate."""
    rate, draws, alpha = 2e-4, 3000, 0.6
    mean, variance = enumerated(score, alpha, rate)
    noise = noise_of(score, alpha, NODES, ACYCLIC, rate=rate, draws=draws)
    by_node = np.argsort(noise.nodes)
    x = dense.solve(score, alpha, NODES, ACYCLIC)
    np.testing.assert_allclose(noise.sd[by_node], np.sqrt(variance), rtol=0.05, atol=1e-12)  # 3 000 draws: 1.3 %
    np.testing.assert_allclose(noise.expected[by_node] - x, mean, rtol=0.01, atol=1e-9)


def noise_of(score: str, alpha: float, n: int, links: dense.Links, *, rate: float, draws: int = 48) -> Noise:
    graph, setting, options = dense.graph_of(n, links), dense.setting(score, alpha), dense.OPTIONS[score]
    now = setting.solve(graph, options=options, beta=1.0)
    rank = rank_places(now.value, now.bound)[0]
    return crawl_noise(graph, setting, now.value, options=options, rank=rank, top=n, rate=rate, draws=draws)


def random_links(seed: int, n: int, per_node: int) -> dense.Links:
    random = np.random.default_rng(seed)
    pairs = {(source, int(n * random.random() ** 2)) for source in range(n) for _ in range(per_node)}
    return [(source, target, 1.0) for source, target in sorted(pairs) if source != target]


def checked(score: str, n: int, links: dense.Links, *, rate: float, draws: int = 150) -> tuple[Noise, Check]:
    graph = dense.graph_of(n, links)
    alpha = dense.legal_alpha(score, n, links, 0.8)
    noise = noise_of(score, alpha, n, links, rate=rate)
    setting, options = dense.setting(score, alpha), dense.OPTIONS[score]
    return noise, resample(graph, setting, noise, options=options, beta=np.ones(n), draws=draws, seed=3)


@SCORES
@pytest.mark.parametrize("seed", [1, 2])
def test_bands_hold_what_resampling_gives(score: str, seed: int) -> None:
    """With hundreds of links behind each value the first order is good: 96 % by construction, .9 asked for."""
    noise, check = checked(score, 150, random_links(seed, 150, 20), rate=0.02)
    top = noise.rank <= 40
    assert check.inside[top].mean() > 0.9
    assert np.median(noise.sd[top] / check.spread[top]) == pytest.approx(1.0, abs=0.15)
    assert (noise.last > noise.first).any()
    wide = np.mean(noise.last[top] - noise.first[top])
    assert wide < 40  # a band of every place would hold everything and say nothing


def test_the_tail_is_not_normal_where_one_link_is_everything() -> None:
    """One link carries 0's value; missed at 1 %, it is missed by 10 sd, a hundred times too often for a normal law."""
    links = random_links(4, 60, 3) + [(59, 60, 50.0)]
    _, check = checked("katz", 61, links, rate=0.01)
    assert check.beyond[4] > 20 * NORMAL[4]


@SCORES
def test_same_seed_same_result(score: str) -> None:
    links = random_links(5, 40, 4)
    one, other = checked(score, 40, links, rate=0.05, draws=5), checked(score, 40, links, rate=0.05, draws=5)
    for mine, yours in zip(one, other, strict=True):
        for name, array in vars(mine).items():
            np.testing.assert_array_equal(array, vars(yours)[name])


@settings(max_examples=20, deadline=None)
@given(network=dense.networks(), seed=st.integers(0, 1000))
def test_relabelled_nodes_have_the_same_exact_effects(network: tuple[int, dense.Links], seed: int) -> None:
    n, links = network
    new = np.random.default_rng(seed).permutation(n)
    moved = [(int(new[source]), int(new[target]), weight) for source, target, weight in links]
    alpha = dense.legal_alpha("fairshare", n, links, 0.8)
    everything = [pushed("fairshare", alpha, n, each)[0].change(np.ones(len(links))) for each in (links, moved)]
    np.testing.assert_allclose(everything[0], everything[1][new], atol=1e-9)


@pytest.mark.parametrize("rate", [0.0, 1.0, -0.1, float("nan")])
def test_an_impossible_rate_is_refused(rate: float) -> None:
    with pytest.raises(ScoreError, match="rate: expected a share of links between 0 and 1"):
        noise_of("katz", 0.1, NODES, SMALL, rate=rate)
