"""Ostrel: the public web of an invented archipelago, one crawl a night."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import date

import numpy as np

from islands import events as plant
from islands.crawl import Crawl, Fault
from islands.lively import mostly_calm
from islands.names import ISLANDS, KINDS, Hosts
from islands.series import Runner
from islands.world import World, sketch

FIRST = date(2031, 3, 1)
NIGHTS = 45

# Night numbers count from 0 = FIRST. Nothing is planted before night 16: a monitor first has to learn what is usual.
DRIPS = {16: (plant.Drip(per_night=2, nights=15, places=(120, 250), endorsed=25),)}
EVENTS: dict[int, Sequence[plant.Event]] = {
    18: (plant.news(25, (250, 600)),),
    20: (plant.hub_drop((300, 1200)),),
    22: (plant.rename((40, 120), aliased=True),),
    32: (plant.ring(23, 6),),
    35: (plant.departure((60, 150)),),
    40: (plant.hub_link((500, 1200), hubs=5, gain=0.8),),
    44: (plant.fresh_farm(50, (400, 800)),),
}
MISSING = 24  # no file at all
LATE = 28  # the file arrives after later nights have been run
FAULTS = {26: Fault(missing=0.35), 38: Fault(cap=60)}


def build(seed: int = 2035, *, size: int = 3000, links: int = 24000) -> World:
    """The first night of Ostrel; ``size`` and ``links`` may be larger for benchmarks."""
    rng = np.random.default_rng([seed, 1])
    hosts = Hosts(np.random.default_rng([seed, 2]))
    traits = [trait for trait, _ in KINDS.values()]
    plan = sketch(rng, size=size, links=links, traits=traits, groups=len(ISLANDS))
    return World(
        plan.source,
        plan.target,
        group=plan.group,
        capacity=size + max(1000, size // 4),
        rng=np.random.default_rng([seed, 3]),
        namer=hosts.newcomers,
        names=hosts.named(plan.kind, plan.group),
    )


def runner(seed: int = 2035) -> Runner:
    """The shipped scenario."""
    return Runner(
        build(seed),
        mostly_calm(weekday=FIRST.weekday()),
        Crawl(np.random.default_rng([seed, 4]), faults=FAULTS),
        events=EVENTS,
        drips=DRIPS,
        seed=seed,
    )
