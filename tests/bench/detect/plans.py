"""What is run: which network, how it changes, what is planted when, which nights the crawl goes wrong."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Final, Literal

import numpy as np
from bench.detect.bases import BASES, base_named
from islands import events as plant
from islands.change import Change, calm
from islands.crawl import Crawl, Fault
from islands.events import Drip, Event, Planted, Stage
from islands.lively import lively
from islands.scoring import Standing, places
from islands.series import Runner
from islands.world import Ids
from scipy import sparse

from swaygauge.graph import Graph
from swaygauge.scores.spectrum import bound_lambda

Model = Literal["alike", "unlike"]
Seeds = Literal["design", "report"]
Places = tuple[int, int]

NIGHTS: Final = 46
FIRST_EVENT: Final = 18  # nights before are for learning; nothing is counted in them
DRIP_NIGHTS: Final = 20
DRIP_STARTS: Final = (19, 21, 23)
MODELS: Final[tuple[Model, ...]] = ("alike", "unlike")

# Planted on the even nights from 18 on, three a night, each twice in a series; faults fall on odd nights.
MENU: Final = (
    *((plant.fresh_farm, k) for k in (5, 10, 20, 50, 100, 200)),
    *((plant.aged_farm, k) for k in (20, 50)),
    *((plant.camouflaged_farm, k) for k in (20, 50)),
    (plant.newcomers_wave, 30),
    *((plant.news, k) for k in (10, 30)),
    *((plant.mutual_ring, k) for k in (8, 20)),
    *(("hub link", 1),) * 2,
    *(("hub drop", 1),) * 2,
    ("departure", 1),
    ("rename", 1),
)

# Nights in a row that go wrong, from night 24 on: the fault and how many nights.
BAD_NIGHTS: Final = {
    "40 % missing, 5 nights": (Fault(missing=0.4), 5),
    "the same 40 % missing, 12 nights": (Fault(missing=0.4, steady=True), 12),
    "the same 70 % missing, 12 nights": (Fault(missing=0.7, steady=True), 12),
    "capped, 5 nights": (Fault(cap=1), 5),
    "capped, 12 nights": (Fault(cap=1), 12),
}
BAD_FROM: Final = 24


@dataclass(frozen=True)
class Plan:
    """One series of nights."""

    base: str
    model: Model
    seed: int
    events: bool
    triple: bool = False  # three times the natural volume
    faults: str = "usual"  # "usual", "none", or one of BAD_NIGHTS
    nights: int = NIGHTS

    @property
    def name(self) -> str:
        """For the per-event list and progress."""
        what = "events" if self.events else "quiet"
        volume = ", triple volume" if self.triple else ""
        return f"{self.base}, {self.model}, {what}, seed {self.seed}{volume}, faults: {self.faults}"


def plans(seeds: Seeds, *, short: bool = False) -> tuple[Plan, ...]:
    """Everything that the table rests on. Design seeds are for choosing, report seeds for reporting."""
    first = {"design": 1000, "report": 2000}[seeds]
    if short:
        chosen = [Plan("collegemsg", model, first + 1, events) for model in MODELS for events in (True, False)]
        return (*chosen, Plan("collegemsg", "unlike", first + 101, False, faults="40 % missing, 5 nights"))
    usual = [
        Plan(base, model, first + number + (0 if events else 100), events)
        for model in MODELS
        for base in BASES
        for events in (True, False)
        for number in (1, 2)
    ]
    triple = [
        Plan(base, "unlike", first + (1 if events else 101), events, triple=True)
        for base in BASES
        for events in (True, False)
    ]
    bad = [
        Plan(base, model, first + 101, False, faults=faults)
        for model in MODELS
        for base in ("islands", "collegemsg")
        for faults in ("none", *BAD_NIGHTS)
    ]
    return (*usual, *triple, *bad)


def faults_of(plan: Plan) -> dict[int, Fault]:
    """By night."""
    cap = base_named(plan.base).cap
    if plan.faults == "none":
        return {}
    if plan.faults == "usual":
        shares = {27: 0.15, 31: 0.05, 35: 0.40, 43: 0.50}
        return {night: Fault(missing=share) for night, share in shares.items()} | {39: Fault(cap=cap)}
    fault, nights = BAD_NIGHTS[plan.faults]
    fault = Fault(missing=fault.missing, steady=fault.steady, cap=cap if fault.cap else 0)
    return dict.fromkeys(range(BAD_FROM, BAD_FROM + nights), fault)


def runner_of(plan: Plan) -> Runner:
    """The world of a plan, ready to run."""
    base = base_named(plan.base)
    times = 3.0 if plan.triple else 1.0
    change: Change = calm(volume=0.003 * times) if plan.model == "alike" else lively(volume=0.0034 * times)
    rough = {"unevenness": 0.4, "outages": 0.2} if plan.model == "unlike" else {}
    crawl = Crawl(
        np.random.default_rng([plan.seed, 4]),
        flicker=(0.002, 0.02),
        births_seen=False,
        faults=faults_of(plan),
        **rough,
    )
    rng = np.random.default_rng([plan.seed, 5])
    return Runner(
        base.world(plan.seed),
        change,
        crawl,
        events=_events(rng, base.watch_rank, plan.nights) if plan.events else {},
        drips=_drips(rng, base.watch_rank) if plan.events else {},
        seed=plan.seed,
        solve=fast_standing,
        radius=fast_radius,
    )


def fast_standing(keys: Ids, capacity: int, score: str, *, alpha: float, weight: Ids | None = None) -> Standing:
    """What :func:`islands.scoring.standing` gives, by SciPy's sparse product; a test holds the two together."""
    source, target = keys // capacity, keys % capacity
    worth = np.ones(len(keys)) if weight is None else weight.astype(float)
    if score == "fairshare":
        worth = worth / np.bincount(source, worth, capacity)[source]
    flow = sparse.csr_array((alpha * worth, (target, source)), shape=(capacity, capacity))
    value, step = np.ones(capacity), np.inf
    while step >= 1e-10 * float(value.max()):
        last, value = value, 1.0 + flow @ value
        step = float(np.abs(value - last).max())
    present = np.zeros(capacity, bool)
    present[source] = present[target] = True
    return Standing(value=value, place=places(value, present))


def fast_radius(keys: Ids, capacity: int, weight: Ids) -> float:
    """What :func:`islands.scoring.spectral_radius` gives, by the package's own bounds."""
    graph = Graph(capacity, (keys // capacity).astype(np.int32), (keys % capacity).astype(np.int32))
    return bound_lambda(graph).upper


def bands(watch_rank: int) -> tuple[Places, ...]:
    """Four stretches of places: the top, well watched, around the last watched place, below it."""
    a, b, c, d = (round(watch_rank * share) for share in (0.06, 0.4, 1.5, 4.0))
    return (8, a), (a, b), (b, c), (c, d)


def _events(rng: np.random.Generator, watch_rank: int, nights: int) -> dict[int, Sequence[Event]]:
    order = [*rng.permutation(len(MENU)), *rng.permutation(len(MENU))]
    when = range(FIRST_EVENT, nights - 1, 2)
    chosen = {night: order[3 * i : 3 * i + 3] for i, night in enumerate(when)}
    spare = plant.news(10, (8, 4 * watch_rank))  # where a network has no room for what was meant
    return {
        night: tuple(_any_of((_event(rng, watch_rank, int(at)), spare)) for at in items)
        for night, items in chosen.items()
    }


def _event(rng: np.random.Generator, watch_rank: int, at: int) -> Event:
    what, count = MENU[at]
    top, upper, middle, deep = bands(watch_rank)
    anywhere = (top, upper, middle, deep)[rng.integers(4)]
    if what == "hub link":
        return _any_of(plant.hub_link((upper[0], middle[1]), hubs=20, gain=gain) for gain in (1.0, 0.5, 0.2, 0.0))
    if what == "hub drop":
        return _any_of(plant.hub_drop((top[0], middle[1]), hubs=hubs, loss=0.3) for hubs in (20, 100, 300))
    if what == "departure":
        return plant.departure((top[0] + 10, watch_rank // 2))
    if what == "rename":
        return plant.rename((top[0] + 10, watch_rank // 2), aliased=False)
    if what is plant.mutual_ring:
        return plant.mutual_ring(count, (middle[1], 10**9))
    assert callable(what)
    return what(count, anywhere)


def _any_of(tries: Iterable[Event]) -> Event:
    """The first that the network has room for."""
    events = tuple(tries)

    def happen(stage: Stage) -> Planted:
        for event in events[:-1]:
            try:
                return event(stage)
            except ValueError:
                continue
        return events[-1](stage)

    return happen


def _drips(rng: np.random.Generator, watch_rank: int) -> dict[int, Sequence[Drip]]:
    _, *lower = bands(watch_rank)
    return {
        night: tuple(
            Drip(rate, DRIP_NIGHTS, lower[rng.integers(3)], others=(0, 2), until=watch_rank) for rate in (1, 2, 3)
        )
        for night in DRIP_STARTS
    }
