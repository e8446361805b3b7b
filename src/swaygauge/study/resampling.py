"""The same places with links really left out, solved again each time: what the delta method is checked against."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from swaygauge.graph import Graph
from swaygauge.records import Floats
from swaygauge.scores.ranks import rank_places
from swaygauge.study.setting import Options, Setting
from swaygauge.study.steadiness import Links, Noise

FULL = 200  # draws on a small network
FULL_LINKS = 200_000  # up to so many links; more links, fewer draws
FEWEST = 20
NORMAL = {2: 0.0455, 3: 0.0027, 4: 0.000063}  # P(|z| > k) of the normal law


@dataclass(frozen=True, eq=False)
class Check:
    """How a resampling run agrees with the bands, for the nodes of a :class:`~swaygauge.study.steadiness.Noise`."""

    draws: int
    inside: Floats  # (k,) share of draws in which the node's place lay in its band
    spread: Floats  # (k,) standard deviation of its value over the draws
    beyond: dict[int, float]  # c -> share of (node, draw) whose value lay more than c delta-method sd from expected


def draws_for(links: int) -> int:
    """How many draws a network of so many links gets.

    >>> draws_for(20_000), draws_for(1_000_000), draws_for(50_000_000)
    (200, 40, 20)
    """
    return max(FEWEST, min(FULL, FULL * FULL_LINKS // max(links, 1)))


def resample(
    graph: Graph, setting: Setting, noise: Noise, *, options: Options, beta: Floats, draws: int, seed: int
) -> Check:
    """Leave each link out with probability ``noise.rate``, solve, rank; ``draws`` times.

    alpha stays as it is, and stays legal: links left out never raise lambda. Raises NotConverged.
    """
    random = np.random.default_rng([seed, 2])
    links = Links.of(graph)
    nodes = noise.nodes
    inside = np.zeros(len(nodes))
    values = np.empty((draws, len(nodes)))
    for number in range(draws):
        solution = setting.solve(
            links.without(random.random(graph.m) < noise.rate, graph.n), options=options, beta=beta
        )
        place = rank_places(solution.value, solution.bound)[0][nodes]
        inside += (noise.first <= place) & (place <= noise.last)
        values[number] = solution.value[nodes]
    away = np.abs(values - noise.expected)
    # a node whose value cannot change (sd 0) is not beyond anything as long as it did not change
    beyond = {c: float(np.mean(away > c * noise.sd + 1e-9 * noise.expected)) for c in NORMAL}
    return Check(draws, inside / draws, values.std(axis=0, ddof=1), beyond)
