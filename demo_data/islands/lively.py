"""The wilder model of natural change: what calm counting models do not expect.

Attention excites itself and spills over, news stories flare and fade, some publish or copy whole lists at once,
newcomers follow defaults and arrive in waves, whole lists vanish and come back, departures come in clumps, weeks have
a rhythm.
Shares and exponents are set by judgement (common practice, no source), not fitted to any network.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from islands.change import BUSY_WEEK, Attention, Change, Leavers, Newcomers, Process, SingleLinks, SingleLosses
from islands.world import Floats, Ids, Keys, World, draw, draw_near


def _cosy_sources(world: World, target: Ids) -> Ids:
    """Who would link there: 40 % a friend of a friend of the target, 25 % its own group, else whoever links much."""
    rng = world.rng
    source = world.pick_sources(len(target))
    way = rng.random(len(target))
    near = np.flatnonzero((way >= 0.40) & (way < 0.65))
    eager = (world.out_degree() + 0.3) * world.alive
    source[near] = draw_near(rng, eager, world.group, world.group[target[near]])
    sources_of = world.endorsers()
    for i in np.flatnonzero(way < 0.40):
        friends = sources_of(int(target[i]))
        if len(friends):
            second = sources_of(int(rng.choice(friends)))
            if len(second):
                source[i] = rng.choice(second)
    return source


@dataclass
class Excitement:
    """Self-exciting attention: each new link heats its target, heat brings links on the following nights."""

    offspring: float = 0.65  # links that one link brings in the end, on average
    decay: float = 0.6  # share of the heat left after a night
    spill: float = 0.2  # share of the heat that goes to another node of the group
    fitness: Floats = field(default_factory=lambda: np.zeros(0))
    heat: Floats = field(default_factory=lambda: np.zeros(0))

    def step(self, world: World, night: int, amount: float) -> None:
        rng = world.rng
        if len(self.heat) == 0:
            self.fitness, self.heat = np.exp(rng.normal(0, 0.6, world.capacity)), np.zeros(world.capacity)
        base = world.in_degree() ** 0.9 * self.fitness * world.alive + 0.05 * world.alive
        got = rng.poisson(base * (amount * (1 - self.offspring) / base.sum()) + self.heat * world.alive)
        target = np.repeat(np.arange(world.capacity), got)
        world.link(_cosy_sources(world, target), target, night=night)
        mark = np.minimum((rng.pareto(1.5, len(target)) + 1) / 3, 20)  # Pareto(1.5) with mean 1, cut
        spilt = rng.random(len(target)) < self.spill
        warmed = target.copy()
        warmed[spilt] = draw_near(rng, base, world.group, world.group[target[spilt]])
        added = np.bincount(warmed, mark * self.offspring * (1 - self.decay), world.capacity)
        self.heat = self.decay * self.heat + added


@dataclass
class Story:
    """A natural story: how many links each node of it got on each night."""

    night: int
    target: int
    size: int
    links: dict[int, int] = field(default_factory=dict)  # night -> links to the target
    aside: dict[int, dict[int, int]] = field(default_factory=dict)  # night -> related node -> links


@dataclass
class News:
    """Stories of Pareto(1.25) size that fade as (d+1)^-1.5 over ten nights; a quarter goes to related nodes."""

    smallest: int = 3
    largest: int = 300
    told: list[Story] = field(default_factory=list)

    def step(self, world: World, night: int, amount: float) -> None:
        rng = world.rng
        mean = 2.5 * self.smallest  # of the cut Pareto, roughly
        for target in draw(rng, (world.in_degree() + 1.0) * world.alive, int(rng.poisson(amount / mean))):
            size = min(self.largest, int(self.smallest * (rng.pareto(1.25) + 1)))
            self.told.append(Story(night=night, target=int(target), size=size))
        fade = (np.arange(10) + 1.0) ** -1.5
        for story in self.told:
            age = night - story.night
            if age < 10 and world.alive[story.target]:
                self._tell(world, story, night, int(rng.poisson(story.size * fade[age] / fade.sum())))

    def _tell(self, world: World, story: Story, night: int, count: int) -> None:
        target = np.full(count, story.target)
        aside = world.rng.random(count) < 0.25
        related = draw_near(
            world.rng, world.alive.astype(float), world.group, np.full(3, world.group[story.target], np.int64)
        )
        target[aside] = world.rng.choice(related, int(aside.sum()))
        added = world.link(world.pick_sources(count), target, night=night)
        reached, links = np.unique(added % world.capacity, return_counts=True)
        told = dict(zip(reached.tolist(), links.tolist(), strict=True))
        story.links[night] = told.pop(story.target, 0)
        story.aside[night] = told


@dataclass
class Batches:
    """Someone publishes a list of links at once; half of them copy the list of a neighbour."""

    shortest: int = 20
    longest: int = 200

    def step(self, world: World, night: int, amount: float) -> None:
        rng = world.rng
        typical = (self.longest - self.shortest) / np.log(self.longest / self.shortest)
        for publisher in rng.choice(np.flatnonzero(world.alive), int(rng.poisson(amount / typical))):
            size = int(self.shortest * (self.longest / self.shortest) ** rng.random())
            target = draw(rng, (world.in_degree() + 1.0) * world.alive, size)
            if rng.random() < 0.5:
                eager = world.out_degree() * world.alive + 1e-9
                model = draw_near(rng, eager, world.group, world.group[[publisher]])[0]
                copied = rng.permutation(world.targets_of(int(model)))[:size]
                target = np.concatenate([copied, target[: size - len(copied)]])
            world.link(np.full(len(target), publisher), target, night=night)


@dataclass
class Templates:
    """A set of 10-30 targets that spreads: a few sources copy it each night, fewer every night."""

    current: Ids = field(default_factory=lambda: np.zeros(0, np.int64))
    copies: float = 0.0

    def step(self, world: World, night: int, amount: float) -> None:
        rng = world.rng
        if self.copies < 1 and rng.random() < min(1.0, amount / 150):
            self.current = draw(rng, (world.in_degree() + 1.0) * world.alive, int(rng.integers(10, 31)))
            self.copies = float(rng.integers(3, 13))
        for source in world.pick_sources(int(rng.poisson(self.copies)) if self.copies >= 1 else 0):
            world.link(np.full(len(self.current), source), self.current, night=night)
        self.copies *= 0.45


@dataclass
class Onboarding:
    """Newcomers take six default targets (one is swapped now and then), copy a list, and come in waves."""

    defaults: Ids = field(default_factory=lambda: np.zeros(0, np.int64))
    appeal: Floats = field(default_factory=lambda: np.zeros(0))

    def step(self, world: World, night: int, amount: float) -> None:
        rng = world.rng
        popular = (world.in_degree() + 1.0) * world.alive
        if len(self.defaults) == 0:
            self.defaults, self.appeal = draw(rng, popular, 6), rng.uniform(0.3, 0.9, 6)
        if rng.random() < 1 / 17:
            self.defaults[rng.integers(6)] = draw(rng, popular, 1)[0]
        wave = float(rng.uniform(4, 10)) if rng.random() < 0.08 else 1.0
        # six defaults at .6 and about two copied links make 5.6 links each; waves raise the mean by half
        for fresh in world.enroll(int(rng.poisson(wave * amount / (5.6 * 1.5))), night=night):
            taken = self.defaults[rng.random(6) < self.appeal]
            copied = rng.permutation(world.targets_of(int(world.pick_sources(1)[0])))[: rng.geometric(0.4)]
            target = np.concatenate([taken, copied])
            world.link(np.full(len(target), fresh), target, night=night)


@dataclass
class ListLosses:
    """Whole lists vanish (a quarter is back after 2-10 nights), and links younger than ten nights do."""

    longest: int = 400  # nobody with a longer list drops it overnight
    hidden: dict[int, list[Keys]] = field(default_factory=dict)  # night of return -> lists

    def step(self, world: World, night: int, amount: float) -> None:
        rng = world.rng
        for keys in self.hidden.pop(night, []):
            world.link(keys // world.capacity, keys % world.capacity, night=night)
        lists = world.out_degree()
        chance = np.where(lists <= self.longest, lists, 0).astype(float)
        typical = max(1.0, float(chance @ lists) / max(1.0, float(chance.sum())))
        for owner in draw(rng, chance, int(rng.poisson(amount / 2 / typical))):
            taken = world.unlink(world.keys[world.source == owner])
            if rng.random() < 0.25:
                self.hidden.setdefault(night + int(rng.integers(2, 11)), []).append(taken)
        young = world.keys[world.born > max(0, night - 10)]
        world.unlink(rng.permutation(young)[: rng.poisson(amount / 2)])


@dataclass
class ClumpedLeavers:
    """On some nights several nodes of one group leave together."""

    rate: float = 0.0003

    def step(self, world: World, night: int, amount: float) -> None:
        if world.rng.random() < 0.1:
            group = world.group[world.rng.choice(np.flatnonzero(world.alive))]
            there = np.flatnonzero(world.alive & (world.group == group))
            world.retire(world.rng.choice(there, min(len(there), int(world.rng.poisson(10 * self.rate * len(there))))))


def lively(*, volume: float = 0.0034, weekday: int = 0) -> Change:
    """The second model. Its :class:`News` part lists the natural stories it told."""
    parts: tuple[tuple[Process, float], ...] = (
        (Excitement(), 0.55),
        (Onboarding(), 0.15),
        (Batches(), 0.14),
        (News(), 0.10),
        (Templates(), 0.06),
        (ListLosses(), 0.35),
        (SingleLosses(), 0.35),
        (ClumpedLeavers(), 0.0),
        (Leavers(0.0002), 0.0),
    )
    return Change(parts, volume=volume, week=BUSY_WEEK, weekday=weekday, jitter=0.25)


def mostly_calm(*, volume: float = 0.0026, weekday: int = 0, longest_story: int = 12) -> Change:
    """The shipped worlds: the calm model with a little of the wild one (short lists, small stories, a quiet week)."""
    attention = Attention()
    parts: tuple[tuple[Process, float], ...] = (
        (SingleLinks(attention), 0.70),
        (Excitement(), 0.08),
        (News(largest=longest_story), 0.06),
        (Batches(shortest=8, longest=30), 0.06),
        (SingleLosses(), 0.35),
        (ListLosses(longest=15), 0.10),
        (Newcomers(attention), 0.0),
        (Leavers(loyal=True), 0.0),
    )
    return Change(parts, volume=volume, week=(1.05, 1.15, 1.05, 1.0, 1.0, 0.9, 0.85), weekday=weekday, jitter=0.1)


def stories_of(change: Change) -> list[Story]:
    """Every natural story the model has told so far."""
    return [story for process, _ in change.parts if isinstance(process, News) for story in process.told]
