"""What the studies compute, once more with dense matrices and nothing else: numpy.linalg.solve, n up to a few dozen."""

from __future__ import annotations

import numpy as np
from hypothesis import strategies as st

from swaygauge.graph import Graph
from swaygauge.records import Floats
from swaygauge.scores import FairshareOptions, KatzOptions
from swaygauge.study.setting import Options, Setting

OPTIONS: dict[str, Options] = {"katz": KatzOptions(), "fairshare": FairshareOptions()}
Links = list[tuple[int, int, float]]


def matrix(score: str, n: int, links: Links) -> Floats:
    """W (n, n): row u holds what u passes on to each target, per unit of its value."""
    w = np.zeros((n, n))
    for source, target, weight in links:
        w[source, target] += weight
    if score == "fairshare":
        total = w.sum(axis=1, keepdims=True)
        w = np.divide(w, total, out=np.zeros_like(w), where=total > 0)
    return w


def reach(score: str, alpha: float, n: int, links: Links) -> Floats:
    """R = (I - alpha W')^-1."""
    return np.linalg.inv(np.eye(n) - alpha * matrix(score, n, links).T)


def solve(score: str, alpha: float, n: int, links: Links) -> Floats:
    """x = 1 + alpha W'x."""
    return np.linalg.solve(np.eye(n) - alpha * matrix(score, n, links).T, np.ones(n))


def place(value: Floats, node: int) -> int:
    """1 + how many are larger, by more than rounding."""
    return 1 + int(np.count_nonzero(value > value[node] * (1 + 1e-9)))


def graph_of(n: int, links: Links) -> Graph:
    source, target, weight = (list(column) for column in zip(*links, strict=True))
    return Graph(n, source, target, weight=weight)


def legal_alpha(score: str, n: int, links: Links, share: float) -> float:
    """alpha as a share of the largest legal one."""
    if score == "fairshare":
        return share
    radius = float(np.abs(np.linalg.eigvals(matrix(score, n, links))).max())
    return share / max(radius, 0.5)


@st.composite
def networks(draw: st.DrawFn, *, most_nodes: int = 9, most_links: int = 24) -> tuple[int, Links]:
    """Small directed networks with weights, cycles, dangling and unendorsed nodes."""
    n = draw(st.integers(3, most_nodes))
    pairs = [(u, v) for u in range(n) for v in range(n) if u != v]
    chosen = draw(st.lists(st.sampled_from(pairs), min_size=1, max_size=most_links, unique=True))
    weights = draw(
        st.lists(st.sampled_from([1.0, 2.0, 0.5, 7.0]), min_size=len(chosen), max_size=len(chosen))
        if draw(st.booleans())
        else st.just([1.0] * len(chosen))
    )
    return n, [(u, v, weight) for (u, v), weight in zip(chosen, weights, strict=True)]


def setting(score: str, alpha: float) -> Setting:
    return Setting(score, alpha, alpha)
