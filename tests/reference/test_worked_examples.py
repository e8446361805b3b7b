"""Worked examples of the literature, through the public API.

``worked_examples.json`` holds 23 of them: for each its source, whether the values were seen there or come from memory,
the published digits, a recomputation in dense arithmetic, and the tolerance that the printed digits allow.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from swaygauge.graph import Graph
from swaygauge.notebook import Network, eigenvector, fairshare, katz

EXAMPLES: list[dict[str, Any]] = json.loads((Path(__file__).parent / "worked_examples.json").read_text())
BY_ID = {example["id"]: example for example in EXAMPLES}
ALMOST_ONE = 1.0 - 1e-8  # stands for damping 1, which has no fair-share solution of its own


def network_of(given: dict[str, Any]) -> Network:
    n, edges = given["n"], np.array(given["edges"])
    weight = np.full(len(edges), given["edge_weight"]) if "edge_weight" in given else None
    return Network(Graph(n, edges[:, 0], edges[:, 1], weight=weight), tuple(range(n)))


def katz_values(given: dict[str, Any]) -> Any:
    return katz(network_of(given), alpha=given["alpha"], beta=given["beta"]).value


def pagerank_values(given: dict[str, Any]) -> Any:
    """PageRank from fair-share scores. With dangling mass sent to a distribution w instead of everywhere, x is a
    combination of the solutions for the uniform beta and for w, because the equation is linear in beta."""
    network = network_of(given)
    damping = ALMOST_ONE if isinstance(given["damping"], str) else given["damping"]
    dangling = given.get("dangling")
    uniform = fairshare(network, alpha=damping).value
    if not isinstance(dangling, list):
        return uniform / uniform.sum()
    ends = np.bincount(np.array(given["edges"])[:, 0], minlength=network.graph.n) == 0
    sent = fairshare(network, alpha=damping, beta=np.array(dangling) / sum(dangling)).value
    start = (1 - damping) / network.graph.n * uniform
    mass = start[ends].sum() / (1 - damping * sent[ends].sum())
    return start + damping * mass * sent


def leaky_values(given: dict[str, Any]) -> Any:
    return (1 - given["damping"]) * fairshare(
        network_of(given), alpha=given["damping"], beta=np.array(given["teleport"], float)
    ).value


def spam_mass_values(good_core: list[str] | None) -> Any:
    given = BY_ID["spam-mass-2006-p"]["input"]
    beta = np.ones(given["n"]) if good_core is None else np.array([float(name in good_core) for name in given["names"]])
    return fairshare(network_of(given), alpha=given["damping"], beta=beta).value


def farm_target(given: dict[str, Any]) -> Any:
    """A target and k boosting pages that link to each other's side, beside an honest clique of m pages."""
    k, m = given["k"], given["honest_clique"]
    boosters = range(1, k + 1)
    clique = range(k + 1, k + 1 + m)
    links = [(0, b) for b in boosters] + [(b, 0) for b in boosters] + [(a, b) for a in clique for b in clique if a != b]
    value = fairshare(Network.of(links, nodes=range(k + 1 + m)), alpha=given["damping"]).value
    return value[:1] / value.sum() * len(value)


CALCULATIONS: dict[str, Callable[[dict[str, Any]], Any]] = {
    "katz": katz_values,
    "katz_minus_beta": lambda given: katz_values(given) - given["beta"],
    "katz_l2": lambda given: (value := katz_values(given)) / np.linalg.norm(value),
    "pagerank": pagerank_values,
    "eigenvector_l2": lambda given: eigenvector(network_of(given))[0],
    "pagerank_leaky": leaky_values,
    "pagerank_leaky_scaled": lambda given: spam_mass_values(given.get("good_core")),
    "relative_mass": lambda given: (
        1 - (spam_mass_values(BY_ID["spam-mass-2006-pgood"]["input"]["good_core"]) / spam_mass_values(None))[:1]
    ),
    "pagerank*N of target": farm_target,
}


@pytest.mark.parametrize("example", EXAMPLES, ids=lambda example: f"{example['id']} [{example['source']}]")
def test_published_values(example: dict[str, Any]) -> None:
    value = np.asarray(CALCULATIONS[example["kind"]](example["input"]))
    published = np.array(example["expected_published"], float)
    assert value.shape == published.shape
    # a tolerance of the printed digits, and never below the accuracy that scores are solved to
    np.testing.assert_allclose(value, published, rtol=0, atol=max(example["tol"], 1e-10))


def test_all_are_there() -> None:
    assert len(EXAMPLES) == len(BY_ID) == 23
