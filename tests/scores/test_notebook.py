"""The API for notebooks."""

from __future__ import annotations

import subprocess
import sys

import networkx as nx
import numpy as np
import pandas as pd
import pytest

import swaygauge
from swaygauge.errors import AlphaTooLarge, InputError, ScoreError
from swaygauge.notebook import Network, compare, eigenvector, fairshare, katz, lambda_bounds, leaks
from swaygauge.records import ARRIVED, DEPARTED

LINKS = [("a", "b"), ("b", "c"), ("c", "b"), ("a", "c"), ("d", "a")]


def test_three_ways_in_agree() -> None:
    frame = pd.DataFrame(LINKS, columns=["who", "whom"])
    ways = [
        Network.of(LINKS),
        Network.from_frame(frame, source="who", target="whom"),
        Network.from_networkx(nx.DiGraph(LINKS)),
        Network.from_arrays(np.array([u for u, _ in LINKS]), np.array([v for _, v in LINKS])),
    ]
    values = [dict(zip(way.names, katz(way, alpha=0.3).value.tolist(), strict=True)) for way in ways]
    assert all(value == pytest.approx(values[0]) for value in values)


def test_weights() -> None:
    graph = nx.MultiDiGraph()
    graph.add_edge(1, 2, strength=2.0)
    graph.add_edge(1, 2, strength=0.5)
    graph.add_edge(2, 3)
    graph.add_node(9)
    network = Network.from_networkx(graph, weight="strength")
    assert network.names == (1, 2, 3, 9)
    np.testing.assert_allclose(katz(network, alpha=1.0).value, [1, 3.5, 4.5, 1])
    frame = pd.DataFrame({"source": [1], "target": [2], "w": [2.5]})
    np.testing.assert_allclose(katz(Network.from_frame(frame, weight="w"), alpha=1.0).value, [1, 3.5])


def test_what_is_refused() -> None:
    with pytest.raises(InputError, match="directed"):
        Network.from_networkx(nx.Graph([(1, 2)]))
    frame = pd.DataFrame({"source": ["a", None], "target": ["b", "c"]})
    with pytest.raises(InputError, match="column 'source': expected a value in every row, row 1 has none"):
        Network.from_frame(frame)
    with pytest.raises(InputError, match="no column 'to'; it has source, target"):
        Network.from_frame(frame, target="to")
    with pytest.raises(AlphaTooLarge, match=r"Use alpha < 0\.99999"):
        katz(Network.of(LINKS), alpha=1.0)
    with pytest.raises(ScoreError, match="'katz' or 'fairshare', got 'fame'"):
        compare(Network.of(LINKS), Network.of(LINKS), score="fame")


def test_alpha_is_a_share_of_the_limit() -> None:
    network = Network.of(LINKS)
    assert lambda_bounds(network).upper == pytest.approx(1.0)
    assert katz(network, share=0.6).alpha == pytest.approx(0.6)
    assert katz(Network.of([("a", "b")])).alpha == 0.5


def test_tables() -> None:
    scores = fairshare(Network.of(LINKS))
    frame = scores.frame()
    assert frame["rank"].is_monotonic_increasing
    assert scores.top(1)[0][1] == frame["name"][0]
    assert len(scores.top(99)) == 4


def test_diagnostics() -> None:
    value, report = eigenvector(Network.of(LINKS))
    np.testing.assert_allclose(value, [0, 0.5**0.5, 0.5**0.5, 0], atol=1e-9)
    assert report.zeroed_count == leaks(Network.of(LINKS)).zeroed_count == 1


def test_moves_between_two_networks() -> None:
    before, now = Network.of(LINKS), Network.of([*LINKS[:-1], ("e", "a"), ("f", "a"), ("g", "a")])
    for score in ("katz", "fairshare"):
        compared = compare(before, now, score=score)
        status = dict(zip(compared.names, compared.moves.status.tolist(), strict=True))
        assert status["d"] == DEPARTED
        assert status["e"] == ARRIVED
        frame = compared.frame().set_index("name")
        assert frame.loc["f", "status"] == "arrived"
        assert frame.loc["a", "value_now"] > frame.loc["a", "value_before"]


def test_importing_the_package_is_cheap() -> None:
    heavy = {"numba", "scipy", "pandas", "networkx"}
    code = f"import sys, swaygauge, swaygauge.scores; print(sorted({heavy} & set(sys.modules)))"
    out = subprocess.run([sys.executable, "-c", code], check=True, capture_output=True, text=True).stdout
    assert out.strip() == "[]"


def test_names_of_the_package() -> None:
    for name in swaygauge.__all__:
        assert getattr(swaygauge, name) is getattr(swaygauge.notebook, name)
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        _ = swaygauge.nothing
