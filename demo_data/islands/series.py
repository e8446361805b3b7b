"""Nights in a row: natural change, then planted events, then the crawl; and what each event did to the places."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from islands.change import Change
from islands.crawl import Crawl, Seen
from islands.events import Drip, Event, Planted, Stage
from islands.scoring import FAIRSHARE_ALPHA, PIN_SHARE, Standing, octaves, spectral_radius, standing
from islands.world import Ids, Keys, World, contains

SCORES = ("katz", "fairshare")


@dataclass(frozen=True)
class Links:
    """A set of links with their weights."""

    keys: Keys
    weight: Ids


@dataclass(frozen=True)
class Shot:
    """One night: the true links, and which of them the crawl saw."""

    keys: Keys
    weight: Ids
    seen: Seen

    @property
    def observed(self) -> Links:
        return Links(self.keys[self.seen.rows], self.weight[self.seen.rows])


@dataclass(frozen=True)
class Effect:
    """What an event did to one node in one score: the same night without it and with it (true links, 0 = absent)."""

    planted: Planted
    night: int
    node: int
    score: str
    place_before: int  # on the night before
    place_without: int
    place_with: int
    value_without: float
    value_with: float

    @property
    def octaves(self) -> float | None:
        return octaves(self.place_without, self.place_with)


@dataclass
class Series:
    """Everything that happened."""

    world: World
    alpha: float = 0.0  # of katz: .80 / lambda of the first night as crawled
    shots: list[Shot] = field(default_factory=list)
    planted: list[Planted] = field(default_factory=list)
    effects: list[Effect] = field(default_factory=list)


@dataclass
class Runner:
    """Lets the nights of one world pass."""

    world: World
    change: Change
    crawl: Crawl
    events: Mapping[int, Sequence[Event]] = field(default_factory=dict)  # by the night they happen
    drips: Mapping[int, Sequence[Drip]] = field(default_factory=dict)  # by the night they start
    seed: int = 0

    def run(self, nights: int) -> Series:
        """Night 0 is the world as given."""
        world, series = self.world, Series(self.world)
        rng = np.random.default_rng([self.seed, 11])
        taken = np.zeros(world.capacity, bool)
        running: list[tuple[Drip, Planted]] = []
        before = Links(world.keys, world.weight)
        for night in range(nights):
            if night:
                self.change.step(world, night)
            running = [(drip, planted) for drip, planted in running if night < planted.night + drip.nights]
            happening, starting = self.events.get(night, ()), self.drips.get(night, ())
            if running or happening or starting:
                last = {score: self._standing(series, score, before) for score in SCORES}
                stage = Stage(world, night, rng, last["fairshare"], last["katz"], series.alpha, taken)
                for event in happening:
                    without = Links(world.keys, world.weight)
                    planted = event(stage)
                    series.planted.append(planted)
                    self._measure(series, planted, night, last, without)
                for drip in starting:
                    running.append((drip, drip.start(stage)))
                    series.planted.append(running[-1][1])
                for drip, planted in running:
                    drip.step(stage, planted)
                    others = ~contains(planted.added, world.keys)
                    self._measure(series, planted, night, last, Links(world.keys[others], world.weight[others]))
            shot = Shot(world.keys, world.weight, self.crawl.look(world, night))
            series.shots.append(shot)
            before = Links(world.keys, world.weight)
            if night == 0:
                rows = shot.seen.rows
                series.alpha = PIN_SHARE / spectral_radius(shot.keys[rows], world.capacity, shot.weight[rows])
        return series

    def _standing(self, series: Series, score: str, links: Links) -> Standing:
        alpha = series.alpha if score == "katz" else FAIRSHARE_ALPHA
        return standing(links.keys, self.world.capacity, score, alpha=alpha, weight=links.weight)

    def _measure(self, series: Series, planted: Planted, night: int, last: dict[str, Standing], without: Links) -> None:
        now = Links(self.world.keys, self.world.weight)
        for score in SCORES:
            plain, eventful = (self._standing(series, score, links) for links in (without, now))
            for node in planted.nodes:
                series.effects.append(
                    Effect(
                        planted=planted,
                        night=night,
                        node=int(node),
                        score=score,
                        place_before=int(last[score].place[node]),
                        place_without=int(plain.place[node]),
                        place_with=int(eventful.place[node]),
                        value_without=float(plain.value[node]),
                        value_with=float(eventful.value[node]),
                    )
                )
