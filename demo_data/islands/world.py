"""The network itself: who exists, who links to whom, since when."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Ids = NDArray[np.int64]
Keys = NDArray[np.int64]  # one link each: source * capacity + target
Floats = NDArray[np.floating[Any]]
Flags = NDArray[np.bool_]

# (how many, their groups) -> names; the world never looks at a name
Namer = Callable[[Ids], list[str]]


def contains(sorted_keys: Keys, wanted: Keys) -> Flags:
    """Which of ``wanted`` are in the sorted array ``sorted_keys``."""
    if len(sorted_keys) == 0:
        return np.zeros(len(wanted), bool)
    place = np.minimum(np.searchsorted(sorted_keys, wanted), len(sorted_keys) - 1)
    found: Flags = sorted_keys[place] == wanted
    return found


def draw(rng: np.random.Generator, weights: Floats, count: int) -> Ids:
    """``count`` positions with probability proportional to ``weights``, with replacement."""
    steps = np.cumsum(weights)
    place: Ids = np.searchsorted(steps, rng.random(count) * steps[-1], side="right")
    return place


class World:
    """A directed network that only grows in names: a link source -> target endorses target.

    Ids are 0 .. size-1 in order of first existence; ``capacity`` is the most that can ever exist. ``keys`` is sorted;
    ``born`` (the night a link appeared) and ``weight`` lie beside it.
    """

    def __init__(
        self,
        source: Ids,
        target: Ids,
        *,
        group: Ids,
        capacity: int,
        rng: np.random.Generator,
        namer: Namer | None = None,
        names: Sequence[str] | None = None,
        weigh: Callable[[np.random.Generator, int], Ids] | None = None,
    ) -> None:
        self.rng = rng
        self.capacity = capacity
        self.size = len(group)
        self.group = np.full(capacity, -1, np.int64)
        self.group[: self.size] = group
        self.alive = np.zeros(capacity, bool)
        self.alive[: self.size] = True
        self.since = np.zeros(capacity, np.int64)
        self.namer = namer or (lambda groups: [f"node-{self.size + i}" for i in range(len(groups))])
        self.names = list(names) if names is not None else [f"node-{i}" for i in range(self.size)]
        self._weigh = weigh or (lambda _rng, count: np.ones(count, np.int64))
        self.keys: Keys = np.zeros(0, np.int64)
        self.born: Ids = np.zeros(0, np.int64)
        self.weight: Ids = np.zeros(0, np.int64)
        self.link(source, target, night=0)
        self.first_links = len(self.keys)  # the yardstick of every "share of links a night"
        self.first_size = self.size

    @property
    def source(self) -> Ids:
        return self.keys // self.capacity

    @property
    def target(self) -> Ids:
        return self.keys % self.capacity

    def out_degree(self) -> Ids:
        return np.bincount(self.source, minlength=self.capacity)

    def in_degree(self) -> Ids:
        return np.bincount(self.target, minlength=self.capacity)

    def targets_of(self, node: int) -> Ids:
        """Whom ``node`` endorses, ascending."""
        low, high = np.searchsorted(self.keys, (node * self.capacity, (node + 1) * self.capacity))
        targets: Ids = self.keys[low:high] % self.capacity
        return targets

    def sources_of(self, node: int) -> Ids:
        """Who endorses ``node``, ascending."""
        sources: Ids = self.source[self.target == node]
        return sources

    def endorsers(self) -> Callable[[int], Ids]:
        """:meth:`sources_of` for many nodes of the network as it is now: sorted once, then looked up."""
        order = np.argsort(self.target, kind="stable")
        source, target = self.source[order], self.target[order]

        def look(node: int) -> Ids:
            low, high = np.searchsorted(target, (node, node + 1))
            sources: Ids = source[low:high]
            return sources

        return look

    def key(self, source: Ids | int, target: Ids | int) -> Keys:
        return np.atleast_1d(np.asarray(source, np.int64) * self.capacity + np.asarray(target, np.int64))

    def link(self, source: Ids | Sequence[int], target: Ids | Sequence[int], *, night: int) -> Keys:
        """Add links; loops, links that exist and links of nodes that left are passed over. Returns the added keys."""
        key = np.asarray(source, np.int64) * self.capacity + np.asarray(target, np.int64)
        u, v = key // self.capacity, key % self.capacity
        key = np.unique(key[(u != v) & self.alive[u] & self.alive[v]])
        key = key[~contains(self.keys, key)]
        place = np.searchsorted(self.keys, key)
        self.keys = np.insert(self.keys, place, key)
        self.born = np.insert(self.born, place, night)
        self.weight = np.insert(self.weight, place, self._weigh(self.rng, len(key)))
        return key

    def unlink(self, key: Keys) -> Keys:
        """Remove links; returns those that existed."""
        gone = contains(np.unique(key), self.keys)
        removed = self.keys[gone]
        self.keys, self.born, self.weight = self.keys[~gone], self.born[~gone], self.weight[~gone]
        return removed

    def enroll(self, count: int, *, night: int, group: int | None = None) -> Ids:
        """New nodes without links yet, in one group or in groups like those of the living."""
        if self.size + count > self.capacity:
            raise ValueError(
                f"the world is full: {self.size} of {self.capacity} nodes exist, {count} more were asked for; "
                "build it with a larger capacity"
            )
        ids = np.arange(self.size, self.size + count, dtype=np.int64)
        living = np.flatnonzero(self.alive)
        groups = self.group[self.rng.choice(living, count)] if group is None else np.full(count, group)
        self.names += self.namer(groups)
        self.group[ids], self.alive[ids], self.since[ids] = groups, True, night
        self.size += count
        return ids

    def retire(self, nodes: Ids | Sequence[int]) -> Keys:
        """Nodes leave with every link from and to them; returns the removed keys."""
        leaving = np.zeros(self.capacity, bool)
        leaving[np.asarray(nodes, np.int64)] = True
        removed = self.unlink(self.keys[leaving[self.source] | leaving[self.target]])
        self.alive[leaving] = False
        return removed

    def pick_sources(self, count: int) -> Ids:
        """Living nodes, in proportion to how much they already link (a little for those that never did)."""
        return draw(self.rng, (self.out_degree() + 0.3) * self.alive, count)


@dataclass(frozen=True)
class Trait:
    """What one kind of node is like: how many there are, how much it links, how often it is linked."""

    share: float
    links: float  # typical out-degree before scaling
    fame: float
    silent: float = 0.0  # chance of linking nowhere


@dataclass(frozen=True)
class Sketch:
    """A first night: groups, traits, links, before anyone has a name."""

    group: Ids
    kind: Ids  # position in the traits
    source: Ids
    target: Ids


def sketch(
    rng: np.random.Generator,
    *,
    size: int,
    links: int,
    traits: Sequence[Trait],
    groups: int = 8,
    local: float = 0.65,
    mutual: float = 0.25,
    unseen: float = 0.5,
    spread: float = 1.4,
) -> Sketch:
    """A network of about ``links`` links with communities, a strong core, heavy tails, dangling and un-endorsed nodes.

    ``local``: share of links inside the group; ``mutual``: share that is returned; ``unseen``: share of nodes that
    nobody knows (others may stay un-endorsed by chance); ``spread``: sd of the log of fame within a kind.
    """
    shares = np.array([trait.share for trait in traits])
    kind = draw(rng, shares, size)
    group = draw(rng, 1.0 / np.arange(1, groups + 1) ** 0.7, size)
    fame = np.array([trait.fame for trait in traits])[kind] * np.exp(rng.normal(0, spread, size))
    fame[rng.random(size) < unseen] = 0.0
    wish = np.array([trait.links for trait in traits])[kind] * np.exp(rng.normal(0, 0.7, size))
    wish[rng.random(size) < np.array([trait.silent for trait in traits])[kind]] = 0.0
    # mutual links come on top; repeated draws of a famous target are lost, which the factor makes up for
    count = rng.poisson(wish * (1.2 * links / (1 + mutual) / wish.sum()))
    source = np.repeat(np.arange(size), count)
    target = draw(rng, fame, len(source))
    near = np.flatnonzero(rng.random(len(source)) < local)
    target[near] = draw_near(rng, fame, group, group[source[near]])
    back = (rng.random(len(source)) < mutual) & (wish[target] > 0) & (fame[source] > 0)
    source, target = np.concatenate([source, target[back]]), np.concatenate([target, source[back]])
    return Sketch(group=group, kind=kind, source=source, target=target)


def draw_near(rng: np.random.Generator, weights: Floats, group: Ids, wanted: Ids) -> Ids:
    """One position for each wanted group, inside that group, in proportion to ``weights``."""
    order = np.argsort(group, kind="stable")
    steps = np.cumsum(weights[order])
    low = np.searchsorted(group[order], wanted, side="left")
    high = np.searchsorted(group[order], wanted, side="right")
    floor = np.where(low > 0, steps[low - 1], 0.0)
    place = np.searchsorted(steps, floor + rng.random(len(wanted)) * (steps[high - 1] - floor), side="right")
    return order[np.minimum(place, high - 1)].astype(np.int64)
