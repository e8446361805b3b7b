"""Nights in a row: natural change, then planted events, then the crawl; and what each event did to the places."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Protocol

import numpy as np

from islands.change import Change
from islands.crawl import Crawl, Seen
from islands.events import Drip, Event, Planted, Stage
from islands.scoring import (
    FAIRSHARE_ALPHA,
    MATERIAL,
    PIN_LIMIT,
    PIN_SHARE,
    Standing,
    octaves,
    spectral_radius,
    standing,
)
from islands.world import Ids, Keys, World, contains

SCORES = ("katz", "fairshare")


class Solve(Protocol):
    """Like :func:`islands.scoring.standing`."""

    def __call__(
        self, keys: Keys, capacity: int, score: str, *, alpha: float, weight: Ids | None = None
    ) -> Standing: ...


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
    alpha: float = 0.0  # of katz: .80 / lambda of the first night as crawled, pinned anew when lambda outgrows it
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
    solve: Solve = standing  # other ways to the same numbers, where many are asked for
    radius: Callable[[Keys, int, Ids], float] = spectral_radius
    _solved: list[tuple[Keys, str, float, Standing]] = field(default_factory=list)  # the newest few

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
                self._keep_solvable(series)
                last = {score: self._standing(series, score, before) for score in SCORES}
                stage = Stage(world, night, rng, last["fairshare"], last["katz"], series.alpha, taken)
                sides = []
                for event in happening:
                    without = Links(world.keys, world.weight)
                    series.planted.append(event(stage))
                    sides.append((series.planted[-1], without, Links(world.keys, world.weight)))
                self._keep_solvable(series)  # one alpha for the whole night
                for planted, without, eventful in sides:
                    self._measure(series, planted, night, last, (without, eventful))
                for drip in starting:
                    running.append((drip, drip.start(stage)))
                    series.planted.append(running[-1][1])
                for drip, planted in running:
                    drip.step(stage, planted)
                    if self._is_known(series, drip, planted):
                        continue
                    others = ~contains(planted.added, world.keys)
                    without = Links(world.keys[others], world.weight[others])
                    self._measure(series, planted, night, last, (without, Links(world.keys, world.weight)))
            shot = Shot(world.keys, world.weight, self.crawl.look(world, night))
            series.shots.append(shot)
            before = Links(world.keys, world.weight)
            if night == 0:
                rows = shot.seen.rows
                series.alpha = PIN_SHARE / self.radius(shot.keys[rows], world.capacity, shot.weight[rows])
        return series

    def _standing(self, series: Series, score: str, links: Links) -> Standing:
        alpha = series.alpha if score == "katz" else FAIRSHARE_ALPHA
        for keys, name, used, known in self._solved:
            if keys is links.keys and name == score and used == alpha:
                return known
        found = self.solve(links.keys, self.world.capacity, score, alpha=alpha, weight=links.weight)
        self._solved = [*self._solved[-15:], (links.keys, score, alpha, found)]
        return found

    def _is_known(self, series: Series, drip: Drip, planted: Planted) -> bool:
        """Whether a drip that is measured only until it matters does so already."""
        return any(
            abs(effect.octaves or 0.0) >= MATERIAL and min(effect.place_without, effect.place_with) <= drip.until
            for effect in series.effects[::-1]
            if drip.until and effect.planted is planted
        )

    def _keep_solvable(self, series: Series) -> None:
        """A new alpha when lambda has grown too near to 1/alpha."""
        radius = self.radius(self.world.keys, self.world.capacity, self.world.weight)
        if series.alpha * radius > PIN_LIMIT:
            series.alpha = PIN_SHARE / radius

    def _measure(
        self, series: Series, planted: Planted, night: int, last: dict[str, Standing], sides: tuple[Links, Links]
    ) -> None:
        """``sides``: the links without the event and with it."""
        for score in SCORES:
            plain, eventful = (self._standing(series, score, links) for links in sides)
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
