"""What a monitor should find: changes planted on top of the natural ones.

Each function changes the world on one night and returns a :class:`Planted` record; what it did to the ranks is computed
by ``series`` from the world just before and just after. Choosing whom an event happens to needs places, so every
function takes them.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from islands.scoring import Standing
from islands.world import Flags, Ids, Keys, World


@dataclass
class Planted:
    """One planted event, in ids."""

    event: str  # what was planted
    expected: str  # the kind of alert that should tell of it; "" = none
    night: int
    nodes: Ids  # whom the alert should name
    sources: Ids
    added: Keys = field(default_factory=lambda: np.zeros(0, np.int64))
    removed: Keys = field(default_factory=lambda: np.zeros(0, np.int64))
    within: int = 0  # nights later at which it may still be raised
    direction: str = "rose"
    note: str = ""


@dataclass
class Stage:
    """The world on the night of an event, with a random stream of its own and both scores of the night before."""

    world: World
    night: int
    rng: np.random.Generator
    fairshare: Standing
    katz: Standing
    alpha: float  # of katz
    taken: Flags  # nodes that another event already uses

    def pick(self, low: int, high: int, count: int = 1, *, where: Flags | None = None) -> Ids:
        """Nodes at places low..high of fair share that no event uses yet; they are used from now on."""
        place = self.fairshare.place
        free = (place >= low) & (place <= high) & self.world.alive & ~self.taken
        if where is not None:
            free &= where
        found = np.flatnonzero(free)
        if len(found) < count:
            raise ValueError(
                f"night {self.night}: an event needs {count} nodes at places {low} to {high} that fit, "
                f"only {len(found)} do; widen the places or build a larger world"
            )
        chosen = np.sort(self.rng.choice(found, count, replace=False))
        self.taken[chosen] = True
        return chosen

    def leaders(self, count: int, links: int = 1) -> Flags:
        """Who is among the ``count`` first in katz and links at least ``links`` others itself."""
        place = self.katz.place
        return np.asarray((place >= 1) & (place <= count) & self.world.alive & (self.world.out_degree() >= links))


Event = Callable[[Stage], Planted]


def _point_at(stage: Stage, sources: Ids, target: int, others: tuple[int, int]) -> Keys:
    """Each source links the target and between ``others`` of the hundred best-placed nodes."""
    best = np.flatnonzero((stage.fairshare.place >= 1) & (stage.fairshare.place <= 100) & stage.world.alive)
    extra = stage.rng.integers(others[0], others[1] + 1, len(sources))
    source = np.concatenate([sources, np.repeat(sources, extra)])
    target_of = np.concatenate([np.full(len(sources), target), stage.rng.choice(best, int(extra.sum()))])
    return stage.world.link(source, target_of, night=stage.night)


def fresh_farm(count: int, places: tuple[int, int]) -> Event:
    """``count`` sites that did not exist yesterday link one target, and up to three popular sites each."""

    def happen(stage: Stage) -> Planted:
        target = int(stage.pick(*places)[0])
        sources = stage.world.enroll(count, night=stage.night)
        added = _point_at(stage, sources, target, (0, 3))
        return Planted("fresh farm", "surge", stage.night, np.array([target]), sources, added)

    return happen


def aged_farm(count: int, places: tuple[int, int]) -> Event:
    """``count`` existing sites that hardly anyone endorses link one target on one night."""

    def happen(stage: Stage) -> Planted:
        target = int(stage.pick(*places)[0])
        world = stage.world
        quiet = (world.in_degree() <= 1) & (world.out_degree() >= 1) & world.alive
        sources = stage.rng.choice(np.flatnonzero(quiet), count, replace=False)
        added = world.link(sources, np.full(count, target), night=stage.night)
        return Planted("aged farm", "surge", stage.night, np.array([target]), np.sort(sources), added)

    return happen


def camouflaged_farm(count: int, places: tuple[int, int]) -> Event:
    """``count`` existing sites, not all of them obscure, link one target; they endorse each other in a circle and share
    a few targets that are not popular, so that they are neither new nor un-endorsed."""

    def happen(stage: Stage) -> Planted:
        target = int(stage.pick(*places)[0])
        world, rng = stage.world, stage.rng
        plain = (world.in_degree() <= 3) & (world.out_degree() >= 1) & world.alive
        plain[target] = False
        sources = np.sort(rng.choice(np.flatnonzero(plain), count, replace=False))
        circle = world.link(sources, np.roll(sources, 1), night=stage.night)
        unpopular = np.flatnonzero((stage.fairshare.place > 200) & world.alive & (world.in_degree() >= 1))
        shared = rng.choice(unpopular, 5, replace=False)
        source = np.concatenate([np.repeat(sources, 2), sources])
        other = np.concatenate([rng.choice(shared, 2 * count), np.full(count, target)])
        added = np.union1d(circle, world.link(source, other, night=stage.night))
        return Planted("camouflaged farm", "surge", stage.night, np.array([target]), sources, added)

    return happen


def news(count: int, places: tuple[int, int]) -> Event:
    """``count`` established sites (well placed, with several links of their own) link one target on one night."""

    def happen(stage: Stage) -> Planted:
        target = int(stage.pick(*places)[0])
        world = stage.world
        place = stage.fairshare.place
        solid = (place >= 1) & (place <= world.first_size // 2) & (world.out_degree() >= 5) & world.alive
        solid[target] = False
        solid[world.sources_of(target)] = False
        sources = np.sort(stage.rng.choice(np.flatnonzero(solid), count, replace=False))
        added = world.link(sources, np.full(count, target), night=stage.night)
        return Planted("news", "surge", stage.night, np.array([target]), sources, added)

    return happen


def newcomers_wave(count: int, places: tuple[int, int]) -> Event:
    """An honest wave: ``count`` newcomers link one target, and three to eight others that differ from each other's."""

    def happen(stage: Stage) -> Planted:
        target = int(stage.pick(*places)[0])
        world = stage.world
        sources = world.enroll(count, night=stage.night)
        first = world.link(sources, np.full(count, target), night=stage.night)
        source = np.repeat(sources, stage.rng.integers(3, 9, count))
        spread = (world.in_degree() + 1.0) * world.alive
        other = stage.rng.choice(world.capacity, len(source), p=spread / spread.sum())
        added = np.union1d(first, world.link(source, other, night=stage.night))
        return Planted("newcomers wave", "surge", stage.night, np.array([target]), sources, added)

    return happen


def hub_link(places: tuple[int, int], hubs: int = 10, gain: float = 0.5) -> Event:
    """One of the best-placed sites starts to link a little-known one, which adds at least ``gain`` to its katz value
    (as a share of it)."""

    def happen(stage: Stage) -> Planted:
        world, value = stage.world, stage.katz.value
        hub = int(stage.rng.choice(np.flatnonzero(stage.leaders(hubs))))
        small = stage.alpha * value[hub] >= gain * value
        small[world.targets_of(hub)] = False
        target = int(stage.pick(*places, where=small)[0])
        added = world.link([hub], [target], night=stage.night)
        return Planted("hub link", "swing", stage.night, np.array([target]), np.array([hub]), added)

    return happen


def hub_drop(places: tuple[int, int], hubs: int = 10, loss: float = 0.4) -> Event:
    """One of the best-placed sites drops a link that carries at least ``loss`` of its target's katz value: noticed a
    night later, since a missing link is given one more night."""

    def happen(stage: Stage) -> Planted:
        world, value = stage.world, stage.katz.value
        source, target = world.source, world.target
        held = stage.leaders(hubs)[source] & (stage.alpha * value[source] >= loss * value[target])
        dependent = np.zeros(world.capacity, bool)
        dependent[target[held]] = True
        node = int(stage.pick(*places, where=dependent)[0])
        hub = int(source[held & (target == node)][0])
        removed = world.unlink(world.key(hub, node))
        return Planted(
            "hub drop", "swing", stage.night, np.array([node]), np.array([hub]),
            removed=removed, within=1, direction="fell",
        )  # fmt: skip

    return happen


def rename(places: tuple[int, int], *, aliased: bool) -> Event:
    """A host disappears and a new one takes over every link from and to it on the same night."""

    def happen(stage: Stage) -> Planted:
        world = stage.world
        old = int(stage.pick(*places)[0])
        new = int(world.enroll(1, night=stage.night, group=int(world.group[old]))[0])
        removed = world.retire([old])
        source, target = removed // world.capacity, removed % world.capacity
        added = world.link(
            np.where(source == old, new, source), np.where(target == old, new, target), night=stage.night
        )
        return Planted(
            "rename", "" if aliased else "rename", stage.night, np.array([old, new]), np.array([old, new]),
            added, removed, direction="", note="nodes: the old name, then the new one",
        )  # fmt: skip

    return happen


def departure(places: tuple[int, int]) -> Event:
    """A well-placed site is gone, with every link from and to it."""

    def happen(stage: Stage) -> Planted:
        node = stage.pick(*places, where=stage.world.in_degree() >= 5)
        removed = stage.world.retire(node)
        return Planted("departure", "departure", stage.night, node, node, removed=removed, direction="left")

    return happen


def ring(count: int, core: int) -> Event:
    """``count`` fresh sites all link to each other; some link, and are linked by, ``core`` of the best-placed sites."""

    def happen(stage: Stage) -> Planted:
        world, rng = stage.world, stage.rng
        members = world.enroll(count, night=stage.night)
        gates = np.sort(rng.choice(np.flatnonzero(stage.leaders(60, links=5)), core, replace=False))
        inner = (np.repeat(members, count), np.tile(members, count))
        out = (rng.choice(members, 2 * core), np.tile(gates, 2))
        back = (gates, rng.choice(members, core))
        source, target = (np.concatenate(side) for side in zip(inner, out, back, strict=True))
        added = world.link(source, target, night=stage.night)
        return Planted(
            "dense ring", "lambda jump", stage.night, members, np.concatenate([members, gates]), added,
            note="sources: the members, then the core sites tied to them",
        )  # fmt: skip

    return happen


def mutual_ring(count: int, places: tuple[int, int]) -> Event:
    """``count`` existing sites all link to each other on one night; lambda jumps where it was below ``count`` - 1."""

    def happen(stage: Stage) -> Planted:
        members = stage.pick(*places, count=count, where=stage.world.out_degree() >= 1)
        added = stage.world.link(np.repeat(members, count), np.tile(members, count), night=stage.night)
        return Planted("mutual ring", "surge", stage.night, members, members, added)

    return happen


@dataclass
class Drip:
    """A few fresh sites a night endorse one target, among other links, night after night."""

    per_night: int
    nights: int
    places: tuple[int, int]
    others: tuple[int, int] = (1, 2)
    endorsed: int = 0  # least in-degree of the target: two more are less of a surprise to a well-endorsed one
    within: int = 5  # nights after the effect is material
    until: int = 0  # > 0: its effect is measured only until it is material at this place or better

    def start(self, stage: Stage) -> Planted:
        target = stage.pick(*self.places, where=stage.world.in_degree() >= self.endorsed)
        empty = np.zeros(0, np.int64)
        return Planted("slow drip", "drift", stage.night, target, empty, empty, within=self.within)

    def step(self, stage: Stage, planted: Planted) -> None:
        sources = stage.world.enroll(self.per_night, night=stage.night)
        added = _point_at(stage, sources, int(planted.nodes[0]), self.others)
        planted.sources = np.concatenate([planted.sources, sources])
        planted.added = np.union1d(planted.added, added)
