"""One series run through the detector, and its alerts held against the truth."""

from __future__ import annotations

import hashlib
import json
import time
from collections.abc import Iterator, Sequence
from dataclasses import asdict, dataclass, field, replace
from datetime import date, timedelta
from typing import Final

import numpy as np
from bench.detect.bases import base_named
from bench.detect.plans import DRIP_NIGHTS, Plan, faults_of, runner_of
from bench.detect.runner import Options, Told, run_series
from islands.events import Planted
from islands.lively import stories_of
from islands.series import Effect, Series
from islands.world import Ids, contains

from swaygauge.detect import Thresholds
from swaygauge.detect.thresholds import Presence
from swaygauge.kernels.threads import use_threads
from swaygauge.records import Alert, Origin, Snapshot, frozen

FIRST: Final = date(2031, 3, 1)
LEVELS: Final = (1e-3, 1e-4)  # at which surge's p is compared with how often it occurs
STORY_LINKS: Final = 8
OUTAGE: Final = 0.01  # share of sources not fetched; usual is .003
ONE_LINK: Final = ("hub link", "hub drop")


@dataclass(frozen=True)
class AlertSeen:
    """One alert with what the truth says of it."""

    kind: str
    node: int
    direction: str
    size: float
    planted: bool  # its node is part of an event, or most of its changed links were planted
    story: bool  # its node got so many links of one natural story
    burst: int  # natural links its node got tonight


@dataclass(frozen=True)
class NightSeen:
    """One night."""

    number: int
    fault: str
    outage: bool  # so many sources were away by themselves that either verdict is right
    outcome: str
    present: int
    beyond: tuple[int, ...]  # nodes with a p at or below each of LEVELS
    alerts: tuple[AlertSeen, ...]


@dataclass(frozen=True)
class EventSeen:
    """One planted event and whether it was told of."""

    event: str
    night: int
    count: int
    octaves: float  # largest effect on a watched node under either score; 0 = none
    material: bool
    kinds: tuple[str, ...]  # kinds of alert that told of it
    delay: int  # accepted nights after it; -1 = not told of
    material_from: int = -1  # of a drip: the night its effect reached 1.5x


@dataclass(frozen=True)
class SeriesSeen:
    """A whole series."""

    plan: Plan
    nights: tuple[NightSeen, ...]
    events: tuple[EventSeen, ...] = ()
    drips: tuple[EventSeen, ...] = ()
    digest: str = ""  # of every alert and of the detector's last state
    seconds: float = field(default=0.0, compare=False)


def options_for(plan: Plan) -> Options:
    """Defaults, with the desk's places in proportion on the smaller network."""
    watch_rank = base_named(plan.base).watch_rank
    line = round(0.3 * watch_rank)
    return Options(
        thresholds=Thresholds(watch_rank=watch_rank, presence=Presence(arrival_rank=line, departure_rank=line))
    )


def run_timed(plan: Plan) -> SeriesSeen:
    """One series on one thread, with the time it took."""
    use_threads(1)
    start = time.perf_counter()
    return replace(run_plan(plan), seconds=time.perf_counter() - start)


def run_plan(plan: Plan, options: Options | None = None) -> SeriesSeen:
    """The world, the crawl, the detector, the comparison."""
    runner = runner_of(plan)
    series = runner.run(plan.nights)
    options = options or options_for(plan)
    told = list(run_series(snapshots_of(series), options, with_p=not plan.events))
    return compare(plan, series, told, stories=_story_nodes(runner.change), options=options)


def snapshots_of(series: Series) -> Iterator[tuple[Snapshot, int]]:
    """What the crawl saw, night by night, with the length of the name table by then."""
    size, capacity = 0, series.world.capacity
    for night, shot in enumerate(series.shots):
        keys = shot.observed.keys
        source, target = (keys // capacity).astype(np.int32), (keys % capacity).astype(np.int32)
        size = max(size, int(max(source.max(), target.max())) + 1)
        order = np.lexsort((source, target))
        origin = Origin("made", "0" * 64, 0, "made", len(keys))
        yield (
            Snapshot(FIRST + timedelta(days=night), frozen(source[order]), frozen(target[order]), None, origin),
            size,
        )


def _story_nodes(change: object) -> list[set[int]]:
    """Per night, who got STORY_LINKS of one story."""
    nights: dict[int, set[int]] = {}
    for story in stories_of(change):
        for night, links in story.links.items():
            reached = {story.target: links} | story.aside[night]
            nights.setdefault(night, set()).update(node for node, count in reached.items() if count >= STORY_LINKS)
    return [nights.get(night, set()) for night in range(max(nights, default=-1) + 1)]


def compare(
    plan: Plan, series: Series, told: Sequence[Told], *, stories: Sequence[set[int]], options: Options
) -> SeriesSeen:
    """The alerts of all nights against what was planted and what happened by itself."""
    faults = faults_of(plan)
    truth = _Truth(series, stories, options.thresholds)
    nights = tuple(
        NightSeen(
            number=number,
            fault=_fault_name(faults[number]) if number in faults else "",
            outage=truth.away(number) > OUTAGE,
            outcome=night.verdict.outcome,
            present=night.present,
            beyond=tuple(int(np.count_nonzero(night.p <= level)) for level in LEVELS),
            alerts=tuple(truth.seen(number, alert) for alert in night.alerts),
        )
        for number, night in enumerate(told)
    )
    events = [truth.event(planted, told) for planted in series.planted if planted.event != "slow drip"]
    drips = [truth.drip(planted, told) for planted in series.planted if planted.event == "slow drip"]
    return SeriesSeen(plan, nights, tuple(events), tuple(drips), digest_of(told))


def digest_of(told: Sequence[Told]) -> str:
    """SHA-256 over every alert and the last state, so that two runs can be told apart to the byte."""
    digest = hashlib.sha256()
    for night in told:
        digest.update(json.dumps([asdict(alert) for alert in night.alerts], default=str, sort_keys=True).encode())
    state = next(night.state for night in reversed(told) if night.state is not None)
    columns, scalars = state.to_columns()
    for name in sorted(columns):
        digest.update(name.encode() + columns[name].tobytes())
    digest.update(json.dumps(scalars, sort_keys=True).encode())
    return digest.hexdigest()


def _fault_name(fault: object) -> str:
    missing, cap = getattr(fault, "missing", 0.0), getattr(fault, "cap", 0)
    return "capped" if cap else f"{missing:.0%} missing"


class _Truth:
    """What is known of a series beside its alerts."""

    def __init__(self, series: Series, stories: Sequence[set[int]], thresholds: Thresholds) -> None:
        self.series, self.stories, self.thresholds = series, stories, thresholds
        self.capacity = series.world.capacity
        every = [planted.added for planted in series.planted] + [planted.removed for planted in series.planted]
        self.keys = np.unique(np.concatenate(every)) if every else np.zeros(0, np.int64)
        self.dripped = {int(node): p.night for p in series.planted if p.event == "slow drip" for node in p.nodes}
        self.effects: dict[int, list[Effect]] = {}
        for effect in series.effects:
            self.effects.setdefault(id(effect.planted), []).append(effect)

    def away(self, number: int) -> float:
        """The share of sources that were not fetched."""
        shot = self.series.shots[number]
        return len(shot.seen.unfetched) / len(np.unique(shot.keys // self.capacity))

    def seen(self, number: int, alert: Alert) -> AlertSeen:
        fresh = self._changed(number, alert.node)
        planted = int(contains(self.keys, fresh).sum()) if len(fresh) else 0
        part = any(alert.node in p.nodes and p.night <= number <= p.night + 2 for p in self.series.planted)
        part |= number >= self.dripped.get(alert.node, number + 1)
        story = any(alert.node in self.stories[t] for t in (number - 1, number) if 0 <= t < len(self.stories))
        return AlertSeen(
            kind=alert.kind,
            node=alert.node,
            direction=alert.direction,
            size=round(float(alert.size), 3),
            planted=part or 2 * planted >= max(1, len(fresh)),
            story=story,
            burst=len(fresh) - planted,
        )

    def _changed(self, number: int, node: int) -> Ids:
        """True links into a node that came or went tonight or the night before."""
        shots = self.series.shots
        now, then = shots[number].keys, shots[max(0, number - 2)].keys
        into = [keys[keys % self.capacity == node] for keys in (then, now)]
        return np.setxor1d(*into)

    def event(self, planted: Planted, told: Sequence[Told]) -> EventSeen:
        octaves, material = self._effect(self.effects[id(planted)])
        kinds, delay = self._told_of(planted, told, range(planted.night, planted.night + 2))
        if planted.event in ("departure", "rename"):
            places = [e.place_without for e in self.effects[id(planted)] if e.place_without]
            material = min(places, default=10**9) <= self.thresholds.presence.departure_rank
            octaves = 1.0 if material else 0.0
        return EventSeen(planted.event, planted.night, len(planted.sources), octaves, material, kinds, delay)

    def drip(self, planted: Planted, told: Sequence[Told]) -> EventSeen:
        by_night: dict[int, list[Effect]] = {}
        for effect in self.effects[id(planted)]:
            by_night.setdefault(effect.night, []).append(effect)
        since = min((night for night, effects in by_night.items() if self._effect(effects)[1]), default=-1)
        octaves, _ = self._effect(by_night[max(by_night)])
        kinds, delay = self._told_of(planted, told, range(planted.night, planted.night + DRIP_NIGHTS + 5))
        rate = round(len(planted.sources) / (min(len(self.series.shots) - planted.night, DRIP_NIGHTS)))
        return EventSeen("slow drip", planted.night, rate, octaves, since >= 0, kinds, delay, material_from=since)

    def _effect(self, effects: Sequence[Effect]) -> tuple[float, bool]:
        watch = self.thresholds.watch_rank
        sizes = [
            abs(effect.octaves)
            for effect in effects
            if effect.octaves is not None and min(effect.place_without, effect.place_with) <= watch
        ]
        largest = max(sizes, default=0.0)
        return largest, largest >= round(float(np.log2(1.5)), 3)

    def _told_of(self, planted: Planted, told: Sequence[Told], nights: range) -> tuple[tuple[str, ...], int]:
        """Kinds of alert about an event's nodes, and after how many accepted nights the first came."""
        ways = {"rose": ("rose", "came"), "fell": ("fell", "left"), "left": ("fell", "left")}.get(planted.direction)
        kinds: list[str] = []
        delay = -1
        last = nights.stop
        for number in range(nights.start, len(told)):
            if number >= last:
                break
            if told[number].verdict.outcome != "fine":  # no second look at what is missing
                last += 1
            about = [
                alert.kind
                for alert in told[number].alerts
                if _names(alert, planted) and (ways is None or alert.direction in ways)
            ]
            if about and delay < 0:
                delay = number - planted.night
            kinds += about
        return tuple(dict.fromkeys(kinds)), delay


def _names(alert: Alert, planted: Planted) -> bool:
    """Whether an alert is about an event's node; a jump of lambda is about a ring when it names most of it."""
    if alert.kind == "lambda_jump":
        return 2 * np.isin(planted.nodes, alert.facts.get("nodes", ())).sum() > max(2, len(planted.nodes))
    return bool(np.isin(alert.node, planted.nodes))
