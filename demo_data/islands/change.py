"""How a network changes by itself, and the calm model of it.

A :class:`Change` shares a night's volume of new links among processes. The calm model: attention that drifts slowly and
multiplies popularity, links that come and go one by one, newcomers, leavers. ``lively`` holds a wilder one.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Protocol

import numpy as np

from islands.world import Floats, Ids, World, draw, draw_near

FLAT_WEEK = (1.0,) * 7
BUSY_WEEK = (1.1, 1.3, 1.15, 1.05, 1.0, 0.75, 0.6)  # Monday ... Sunday


class Process(Protocol):
    """One way in which links or nodes come or go; ``amount`` is the expected number of links to touch tonight."""

    def step(self, world: World, night: int, amount: float) -> None: ...


@dataclass
class Change:
    """Processes with their shares of ``volume`` (new links a night, as a share of the first night's links)."""

    parts: tuple[tuple[Process, float], ...]
    volume: float = 0.003
    week: tuple[float, ...] = FLAT_WEEK
    weekday: int = 0  # of night 0, Monday = 0
    jitter: float = 0.0  # sd of the log of a night's volume

    def step(self, world: World, night: int) -> None:
        factor = self.week[(night + self.weekday) % 7]
        if self.jitter:
            factor *= float(np.exp(world.rng.normal(0, self.jitter) - self.jitter**2 / 2))
        for process, share in self.parts:
            process.step(world, night, share * factor * self.volume * world.first_links)


@dataclass
class Attention:
    """How much each node is looked at: log attention is an AR(1), multiplied with popularity."""

    memory: float = 0.7
    spread: float = 1.0
    level: Floats = field(default_factory=lambda: np.zeros(0))

    def weights(self, world: World) -> Floats:
        """Tonight's attention; moves one night on."""
        if len(self.level) == 0:
            self.level = world.rng.normal(0, self.spread, world.capacity)
        fresh = world.rng.normal(0, self.spread, world.capacity)
        self.level = self.memory * self.level + np.sqrt(1 - self.memory**2) * fresh
        return np.asarray((world.in_degree() + 1.0) * np.exp(self.level) * world.alive)


@dataclass
class SingleLinks:
    """New links one by one: who links much links more, who is looked at is linked; ``local`` of them near by."""

    attention: Attention
    local: float = 0.5

    def step(self, world: World, night: int, amount: float) -> None:
        source = world.pick_sources(int(world.rng.poisson(amount)))
        world.link(source, self._targets(world, source), night=night)

    def _targets(self, world: World, source: Ids) -> Ids:
        weights = self.attention.weights(world)
        target = draw(world.rng, weights, len(source))
        near = np.flatnonzero(world.rng.random(len(source)) < self.local)
        target[near] = draw_near(world.rng, weights, world.group, world.group[source[near]])
        return target


@dataclass
class SingleLosses:
    """Links vanish one by one, each as likely as any other."""

    def step(self, world: World, night: int, amount: float) -> None:
        count = min(int(world.rng.poisson(amount)), len(world.keys))
        world.unlink(world.rng.choice(world.keys, count, replace=False))


@dataclass
class Newcomers:
    """New nodes (``rate`` of the first night's nodes) with a few links each, some of them endorsed at once."""

    attention: Attention
    rate: float = 0.001
    endorsed: float = 0.7  # endorsements a newcomer gets on its first night, on average

    def step(self, world: World, night: int, amount: float) -> None:
        rng = world.rng
        fresh = world.enroll(int(rng.poisson(self.rate * world.first_size)), night=night)
        weights = self.attention.weights(world)
        typical = max(1.0, len(world.keys) / int(world.alive.sum()) / 3)
        given = np.repeat(fresh, rng.geometric(1 / typical, len(fresh)))
        got = np.repeat(fresh, rng.poisson(self.endorsed, len(fresh)))
        world.link(given, draw(rng, weights, len(given)), night=night)
        world.link(world.pick_sources(len(got)), got, night=night)


@dataclass
class Leavers:
    """Nodes that leave for good (``rate`` of the first night's nodes); with ``loyal``, well-endorsed ones seldom do."""

    rate: float = 0.0003
    loyal: bool = False

    def step(self, world: World, night: int, amount: float) -> None:
        count = int(world.rng.poisson(self.rate * world.first_size))
        chance = world.alive / (1.0 + world.in_degree()) if self.loyal else world.alive.astype(float)
        world.retire(draw(world.rng, chance, count))


def calm(*, volume: float = 0.003) -> Change:
    """The first model: independent links, slowly drifting attention."""
    attention = Attention()
    parts: tuple[tuple[Process, float], ...] = (
        (SingleLinks(attention, local=0.0), 1.0),
        (SingleLosses(), 0.5),
        (Newcomers(attention), 0.0),
        (Leavers(), 0.0),
    )
    return Change(parts, volume=volume)
