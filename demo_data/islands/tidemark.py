"""Tidemark: who follows whom on an invented chat service of the islands, weighted by interactions, once a night."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import date

import numpy as np

from islands import events as plant
from islands.crawl import Crawl
from islands.lively import mostly_calm
from islands.names import Handles
from islands.series import Runner
from islands.world import Ids, Trait, World, sketch

FIRST = date(2031, 5, 5)
NIGHTS = 20

_TRAITS = (
    Trait(0.01, 30, 25),  # the island radio, the ferry desk
    Trait(0.09, 14, 6),
    Trait(0.55, 7, 1.2, 0.05),
    Trait(0.35, 4, 0.4, 0.15),  # lurkers
)
EVENTS: dict[int, Sequence[plant.Event]] = {
    16: (plant.news(12, (60, 160)),),
    19: (plant.fresh_farm(20, (100, 250)),),
}


def _interactions(rng: np.random.Generator, count: int) -> Ids:
    """Heavy-tailed whole numbers, mostly 1 to 3."""
    return np.minimum(rng.pareto(1.6, count) + 1, 40).astype(np.int64)


def runner(seed: int = 2035) -> Runner:
    """The shipped scenario."""
    handles = Handles(np.random.default_rng([seed, 22]))
    plan = sketch(
        np.random.default_rng([seed, 21]), size=520, links=3600, traits=_TRAITS, groups=4, local=0.5, mutual=0.35
    )
    world = World(
        plan.source,
        plan.target,
        group=plan.group,
        capacity=800,
        rng=np.random.default_rng([seed, 23]),
        namer=handles.accounts,
        names=handles.accounts(plan.group),
        weigh=_interactions,
    )
    crawl = Crawl(np.random.default_rng([seed, 24]), flicker=(0.002, 0.006))
    return Runner(world, mostly_calm(longest_story=6), crawl, events=EVENTS, seed=seed)
