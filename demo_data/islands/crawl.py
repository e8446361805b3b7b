"""What a nightly crawl sees of the network: flicker, sources it did not reach, and nights that go wrong."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from islands.world import Flags, Floats, Ids, World


@dataclass(frozen=True)
class Fault:
    """A night that goes wrong: ``missing`` share of the sources not fetched, lists cut at ``cap`` links."""

    missing: float = 0.0
    steady: bool = False  # the same sources on every such night
    cap: int = 0  # 0 = not cut


@dataclass(frozen=True)
class Seen:
    """One night as crawled."""

    rows: Flags  # which of the world's links are in the snapshot
    unfetched: Ids  # sources with links that were not fetched
    cut: Ids  # sources whose list was cut
    flicker: float  # tonight's share of links missed at random


@dataclass
class Crawl:
    """A crawler with its own random stream, so that its noise does not depend on what is planted."""

    rng: np.random.Generator
    flicker: tuple[float, float] = (0.002, 0.01)  # share of links missed a night, log-uniform between the two
    unfetched: float = 0.003  # share of sources not fetched a night
    unevenness: float = 1.0  # shape of the gamma flakiness of sources; smaller = a few very flaky ones
    outages: float = 0.0  # chance that a tenth of one group is not fetched
    births_seen: bool = True  # a link is seen on the night it is born
    faults: Mapping[int, Fault] = field(default_factory=dict)
    _flaky: Floats = field(default_factory=lambda: np.zeros(0))

    def look(self, world: World, night: int) -> Seen:
        """Crawl one night. Where births are seen, no link is missed that night: one nobody saw has no birthday."""
        rng, fault = self.rng, self.faults.get(night, Fault())
        if len(self._flaky) == 0:
            self._flaky = rng.gamma(self.unevenness, 1 / self.unevenness, world.capacity)
        low, high = self.flicker
        flicker = float(np.exp(rng.uniform(np.log(low), np.log(high)))) if high > 0 else 0.0
        source = world.source
        fresh = world.born == night if night and self.births_seen else np.zeros(len(source), bool)
        missed = rng.random(len(source)) < np.minimum(0.5, flicker * self._flaky[source])

        away = rng.random(world.capacity) < self.unfetched + (0.0 if fault.steady else fault.missing)
        if fault.steady:
            away |= self._steady(world.capacity) < fault.missing
        if rng.random() < self.outages:
            group = world.group[rng.choice(np.flatnonzero(world.alive))]
            away |= (world.group == group) & (rng.random(world.capacity) < 0.1)
        new_tonight = np.zeros(world.capacity, bool)
        new_tonight[source[fresh]] = True
        away &= ~new_tonight

        rows = ~away[source] & (fresh | ~missed)
        cut = np.zeros(0, np.int64)
        if fault.cap:
            order = np.lexsort((rng.random(len(source)), ~rows, source))  # seen links first, in random order
            start = np.searchsorted(source[order], source[order])
            beyond = order[np.arange(len(order)) - start >= fault.cap]
            cut = np.unique(source[beyond[rows[beyond]]])
            rows[beyond] = False
        unfetched = np.intersect1d(np.flatnonzero(away), source)
        return Seen(rows=rows, unfetched=unfetched, cut=cut, flicker=flicker)

    def _steady(self, capacity: int) -> Floats:
        """(capacity,) each node's own chance, the same on every night; drawn beside the stream."""
        return np.random.default_rng(int(self._flaky[0] * 2**52)).random(capacity)
