"""A small world of links that changes a little every night, scored with plain SciPy: what the detector is shown."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from datetime import date, timedelta

import numpy as np
import pytest
from scipy import sparse

from swaygauge import detect
from swaygauge.moves import compare_scores
from swaygauge.records import (
    LOST,
    NEW,
    RETURNED,
    Alert,
    Ids,
    LinkBook,
    LinkChanges,
    ScoreSet,
    SpectralBounds,
    Upkeep,
    Verdict,
)

FIRST_NIGHT = date(2031, 3, 1)
FINE = Verdict(outcome="fine", results=())
ALPHAS = {"katz": 0.02, "fairshare": 0.85}


def score_links(source: Ids, target: Ids, score: str, night: date) -> ScoreSet:
    """One score of one night: x = 1 + alpha W'x, repeated to rounding."""
    ids = np.unique(np.concatenate((source, target))).astype(np.int32)
    u, v, n = np.searchsorted(ids, source), np.searchsorted(ids, target), len(ids)
    weight = np.ones(len(u)) if score == "katz" else 1.0 / np.bincount(u, minlength=n)[u]
    flow = sparse.csr_array((ALPHAS[score] * weight, (v, u)), shape=(n, n))
    value = np.ones(n)
    for _ in range(400):
        last, value = value, 1.0 + flow @ value
        if np.abs(value - last).max() <= 1e-13 * value.max():
            break
    ordered = np.sort(value)
    rank = (1 + n - np.searchsorted(ordered, value * (1 + 1e-9), side="right")).astype(np.int32)
    bound = 1e-10 * value
    return ScoreSet(night, score, ALPHAS[score], ids, value, bound, rank, rank, rank, residual=1e-12, sweeps=1)


@dataclass
class World:
    """Links are kept as source << 32 | target. Each night: some new links drawn to the endorsed, some old ones gone."""

    seed: int
    size: int = 2000
    links_per_node: float = 6.0
    churn: float = 0.003
    thresholds: detect.Thresholds = field(default_factory=detect.Thresholds)

    def __post_init__(self) -> None:
        self.random = np.random.default_rng(self.seed)
        self.next_id = self.size
        self.attention = self.random.lognormal(0.0, 1.0, 40 * self.size)
        self.links = np.unique(self.draw(int(self.size * self.links_per_node)))
        self.history = 0
        self.night = FIRST_NIGHT
        self.known: set[int] = set()
        self.before: tuple[np.ndarray, dict[str, ScoreSet]] | None = None
        self.state: detect.DetectorState | None = None
        self.inputs: list[detect.NightInputs] = []

    def draw(self, count: int) -> np.ndarray:
        """Links with targets in proportion to attention."""
        source = self.random.integers(0, self.size, count)
        chance = self.attention[: self.size] / self.attention[: self.size].sum()
        target = self.random.choice(self.size, count, p=chance)
        return self.pack(source[source != target], target[source != target])

    @staticmethod
    def pack(source: Iterable[int] | np.ndarray, target: Iterable[int] | np.ndarray | int) -> np.ndarray:
        """Links as single numbers."""
        source, target = np.broadcast_arrays(np.asarray(source, np.int64), np.asarray(target, np.int64))
        return (source << 32) | target

    def fresh(self, count: int) -> np.ndarray:
        """Ids of nodes never seen before."""
        self.next_id += count
        return np.arange(self.next_id - count, self.next_id)

    def rank(self, score: str = "fairshare") -> dict[int, int]:
        """Tonight's ranks by node."""
        assert self.before is not None
        scores = self.before[1][score]
        return dict(zip(scores.ids.tolist(), scores.rank.tolist(), strict=True))

    def at_rank(self, rank: int, score: str = "fairshare") -> int:
        """The node nearest to a rank."""
        ranks = self.rank(score)
        return min(ranks, key=lambda node: (abs(ranks[node] - rank), node))

    def endorsers(self, node: int) -> np.ndarray:
        """Who endorses a node."""
        return self.links[(self.links & 0xFFFFFFFF) == node] >> 32

    def pass_night(
        self, add: np.ndarray | None = None, drop: np.ndarray | None = None, *, verdict: Verdict = FINE, days: int = 1
    ) -> tuple[Alert, ...]:
        """One night of natural change plus what is planted; returns its alerts."""
        if self.history:
            self.night += timedelta(days=days)
            if self.churn:
                gone = self.random.random(len(self.links)) < self.churn / 2
                self.links = np.union1d(self.links[~gone], self.draw(int(self.churn * len(self.links))))
        if add is not None:
            self.links = np.union1d(self.links, add)
        if drop is not None:
            self.links = np.setdiff1d(self.links, drop)
        return self.judge(verdict)

    def judge(self, verdict: Verdict) -> tuple[Alert, ...]:
        """Show tonight's links to the detector."""
        inputs = self.show(verdict)
        alerts, self.state = detect.detect(inputs, self.state, self.thresholds)
        self.inputs.append(inputs)
        self.history += 1
        return alerts

    def show(self, verdict: Verdict) -> detect.NightInputs:
        """The inputs of tonight; remembers tonight as the night before."""
        links = self.links[np.argsort(((self.links & 0xFFFFFFFF) << 32) | (self.links >> 32))]
        source, target = (links >> 32).astype(np.int32), (links & 0xFFFFFFFF).astype(np.int32)
        none = np.zeros(len(links), np.uint8)
        book = LinkBook(self.night, source, target, None, none, none)
        scores = {name: score_links(source, target, name, self.night) for name in ALPHAS}
        was = self.before[0] if self.before else np.zeros(0, np.int64)
        changes = self.difference(was, links)
        nodes = self.next_id
        moves = {name: compare_scores(self.before[1][name], scores[name]) for name in ALPHAS} if self.before else {}
        count = {kind: int(np.sum(changes.kind == kind)) for kind in (NEW, RETURNED, LOST)}
        departed = np.setdiff1d(
            np.unique(np.concatenate((was >> 32, was & 0xFFFFFFFF))), np.concatenate((source, target))
        ).astype(np.int32)
        inputs = detect.NightInputs(
            network="ostrel",
            night=self.night,
            verdict=verdict,
            history=self.history,
            nodes=nodes,
            previous=self.inputs[-1].night if self.inputs else None,
            gap_nights=(self.night - self.inputs[-1].night).days - 1 if self.inputs else 0,
            book=book,
            changes=changes,
            upkeep=Upkeep(0, 0, 0, count[RETURNED], count[NEW], count[LOST], 0, departed, np.zeros(0, np.int32), False),
            in_degree_before=np.bincount(was & 0xFFFFFFFF, minlength=nodes).astype(np.int64),
            moves=moves,
            bounds_before=SpectralBounds(5.0, 5.0, 0),
            bounds_now=SpectralBounds(5.0, 5.0, 0),
        )
        self.known.update(links.tolist())
        self.before = (links, scores)
        return inputs

    def difference(self, was: np.ndarray, now: np.ndarray) -> LinkChanges:
        """The changed links, sorted by target and source."""
        added, lost = np.setdiff1d(now, was), np.setdiff1d(was, now)
        kind = np.array([RETURNED if link in self.known else NEW for link in added.tolist()], np.uint8)
        rows = np.concatenate((added, lost))
        kinds = np.concatenate((kind, np.full(len(lost), LOST, np.uint8)))
        order = np.argsort(((rows & 0xFFFFFFFF) << 32) | (rows >> 32))
        rows, kinds = rows[order], kinds[order]
        here = (kinds != LOST).astype(np.float64)
        return LinkChanges(
            (rows >> 32).astype(np.int32),
            (rows & 0xFFFFFFFF).astype(np.int32),
            kinds,
            1.0 - here,
            here,
            np.zeros(len(rows), np.bool_),
        )


@pytest.fixture
def make_world() -> Callable[..., World]:
    """A world by seed; ``nights`` quiet nights may pass before it is handed over."""

    def make(seed: int, *, nights: int = 0, **options: object) -> World:
        world = World(seed, **options)  # type: ignore[arg-type]  # options are World's own fields
        for _ in range(nights):
            world.pass_night()
        return world

    return make
