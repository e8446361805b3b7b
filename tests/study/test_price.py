"""The price of a place against dense solves of networks that really hold the fresh endorsers."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from study import dense

from swaygauge.study.price import Price, buyers, needed_endorsers, price_of_place

SCORES = pytest.mark.parametrize("score", ["katz", "fairshare"])


def priced(score: str, alpha: float, n: int, links: dense.Links, node: int, rank: int, weight: float = 1.0) -> Price:
    graph, setting, options = dense.graph_of(n, links), dense.setting(score, alpha), dense.OPTIONS[score]
    now = setting.solve(graph, options=options, beta=1.0)
    return price_of_place(graph, setting, now, options=options, beta=np.ones(n), node=node, rank=rank, weight=weight)


def place_with(score: str, alpha: float, n: int, links: dense.Links, node: int, fresh: int, weight: float) -> int:
    """The place of ``node`` after so many new nodes, each with one link to it, have joined the network."""
    more = [(n + number, node, weight) for number in range(fresh)]
    return dense.place(dense.solve(score, alpha, n + fresh, links + more), node)


@SCORES
@settings(deadline=None)
@given(network=dense.networks(), share=st.sampled_from([0.3, 0.6, 0.85]), data=st.data())
def test_so_many_reach_the_place_and_one_fewer_do_not(
    score: str, network: tuple[int, dense.Links], share: float, data: st.DataObject
) -> None:
    n, links = network
    node, rank = data.draw(st.integers(0, n - 1)), data.draw(st.integers(1, 3))
    weight = data.draw(st.sampled_from([1.0, 2.5]))
    alpha = dense.legal_alpha(score, n, links, share)
    price = priced(score, alpha, n, links, node, rank, weight)
    assert price.place == dense.place(dense.solve(score, alpha, n, links), node)
    if price.endorsers is None:
        w, unit = dense.matrix(score, n, links), np.eye(n)[node]
        for fresh in (*range(40), 100, 1_000, 100_000):  # as own importance: the same, and cheap for many
            own = np.ones(n) + fresh * alpha * (weight if score == "katz" else 1.0) * unit
            assert dense.place(np.linalg.solve(np.eye(n) - alpha * w.T, own), node) > rank
        return
    assert price.confirmed
    if price.endorsers <= 400:
        assert place_with(score, alpha, n, links, node, price.endorsers, weight) <= rank
        if price.endorsers:
            assert place_with(score, alpha, n, links, node, price.endorsers - 1, weight) > rank


@settings(deadline=None)
@given(network=dense.networks(), data=st.data())
def test_the_gap_divided_by_the_own_gain_alone_is_a_lower_bound(
    network: tuple[int, dense.Links], data: st.DataObject
) -> None:
    """The textbook ceil((x_(r) - x_w) / (alpha beta R_ww)) forgets that rivals gain as well."""
    n, links = network
    node = data.draw(st.integers(0, n - 1))
    alpha = dense.legal_alpha("katz", n, links, 0.8)
    x, r = dense.solve("katz", alpha, n, links), dense.reach("katz", alpha, n, links)
    simple = max(0.0, float(x.max() - x[node])) / (alpha * r[node, node])
    assert needed_endorsers(x, r[:, node], node, rank=1, each=alpha) >= math.ceil(simple * (1 - 1e-9))


def test_two_stars_by_hand() -> None:
    """Five leaves endorse 0, one endorses 1; alpha = 1/2. 1 has 1.5 and 0 has 3.5; each fresh endorser adds .5."""
    links = [(leaf, 0, 1.0) for leaf in range(2, 7)] + [(7, 1, 1.0)]
    assert priced("katz", 0.5, 8, links, 1, 1) == Price(1, 2, 4, True)
    assert priced("katz", 0.5, 8, links, 0, 1) == Price(0, 1, 0, True)
    assert priced("katz", 0.5, 8, links, 2, 3).endorsers == 0  # ties with the other leaves at place 3


def test_a_place_that_cannot_be_bought() -> None:
    """1 passes everything on to 0 with weight 4: what 1 gains, 0 gains more than once over."""
    links = [(1, 0, 4.0), (2, 0, 1.0)]
    assert priced("katz", 0.5, 3, links, 1, 1).endorsers is None


def test_buyers_stand_around_the_place() -> None:
    value = np.array([9.0, 8.0, 8.0, 5.0, 4.0, 3.0, 2.0, 1.0, 0.5, 0.1])
    assert buyers(value, around=5, count=3) == [3, 4, 5]
    assert buyers(value, around=50, count=3) == [9]
    assert buyers(np.empty(0), around=5, count=3) == []


def test_a_rival_that_gains_more_is_counted() -> None:
    """0 endorses 1 with weight 4 and alpha = 1/2, so 1 gains twice what 0 does: only second is in reach."""
    links = [(0, 1, 4.0), *((leaf, 2, 1.0) for leaf in range(3, 9))]
    assert priced("katz", 0.5, 9, links, 0, 1).endorsers is None
    second = priced("katz", 0.5, 9, links, 0, 2)
    assert second == Price(0, 3, 6, True)
    assert place_with("katz", 0.5, 9, links, 0, 6, 1.0) == 2
