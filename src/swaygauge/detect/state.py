"""What the detector remembers from one night to the next. Never patched: replaying gives the same bytes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from swaygauge.detect.counts import CountHistory
from swaygauge.detect.guard import GuardHistory
from swaygauge.detect.spread import SpreadHistory
from swaygauge.detect.sums import DriftAlarms, ScoreSums
from swaygauge.detect.swings import ratios_of
from swaygauge.detect.thresholds import Thresholds
from swaygauge.records import Flags, Ids, Ints

Columns = dict[str, NDArray[Any]]


@dataclass(frozen=True)
class DriftMemory:
    """What drift remembers of the followed nodes (k,), sorted by id, with w trailing nights, oldest first."""

    ids: Ids
    sums: dict[str, ScoreSums]  # score name -> sums
    new: Ids  # (w, k) new endorsements per night
    lost: Ids  # (w, k)
    due: NDArray[np.float64]  # (w, k) new endorsements expected by standing
    first_night: int  # number of the first night drift ran on; -1 = it has not yet

    @staticmethod
    def empty(window: int, first_night: int = -1) -> DriftMemory:
        """Nobody followed yet."""
        counts = np.zeros((window, 0), np.int32)
        return DriftMemory(np.zeros(0, np.int32), {}, counts, counts, np.zeros((window, 0)), first_night)


@dataclass(frozen=True)
class DetectorState:
    """The state after an accepted night, a pure function of the accepted nights up to it and the thresholds."""

    seen: Flags  # (nodes,) present on some accepted night
    gains: CountHistory
    losses: CountHistory
    guard: GuardHistory
    spread: dict[str, SpreadHistory]  # score name -> usual sizes of change
    drift: DriftMemory
    alarms: DriftAlarms
    renamed: Ids  # old nodes of recent rename proposals, whose departure is then no news
    renamed_on: Ints  # the numbers of those nights
    swings: Ints  # (t, ratios) nodes that swung on the trailing nights, under each ratio
    limits: tuple[float, ...]  # drift limits, count tails and swing ratios that the sums were kept for
    tails: tuple[float, ...]
    ratios: tuple[float, ...]

    @staticmethod
    def empty(nodes: int, thresholds: Thresholds) -> DetectorState:
        """Before the first night."""
        tails, ratios = tails_of(thresholds), ratios_of(thresholds.swing)
        return DetectorState(
            seen=np.zeros(nodes, np.bool_),
            gains=CountHistory.empty(nodes),
            losses=CountHistory.empty(nodes),
            guard=GuardHistory.empty(len(tails)),
            spread={},
            drift=DriftMemory.empty(thresholds.drift.window),
            alarms=DriftAlarms(),
            renamed=np.zeros(0, np.int32),
            renamed_on=np.zeros(0, np.int64),
            swings=np.zeros((0, len(ratios)), np.int64),
            limits=thresholds.drift.limits,
            tails=tails,
            ratios=ratios,
        )

    def fitted(self, nodes: int, thresholds: Thresholds) -> DetectorState:
        """The same with room for nodes named since; what was kept for other limits or tails starts again."""
        tails, drift, ratios = tails_of(thresholds), self.drift, ratios_of(thresholds.swing)
        same_sums = self.limits == thresholds.drift.limits and len(drift.new) == thresholds.drift.window
        return DetectorState(
            seen=np.concatenate((self.seen, np.zeros(nodes - len(self.seen), np.bool_))),
            gains=self.gains.grown(nodes),
            losses=self.losses.grown(nodes),
            guard=self.guard if self.tails == tails else GuardHistory.empty(len(tails)),
            spread=self.spread,
            drift=drift if same_sums else DriftMemory.empty(thresholds.drift.window),
            alarms=self.alarms if same_sums else DriftAlarms(),
            renamed=self.renamed,
            renamed_on=self.renamed_on,
            swings=self.swings if self.ratios == ratios else np.zeros((0, len(ratios)), np.int64),
            limits=thresholds.drift.limits,
            tails=tails,
            ratios=ratios,
        )

    def to_columns(self) -> tuple[Columns, dict[str, Any]]:
        """Plain one-dimensional arrays of various lengths by name, and a JSON-able dict of the rest."""
        columns: Columns = {"seen": self.seen, "renamed": self.renamed, "renamed_on": self.renamed_on}
        for name, history in (("gains", self.gains), ("losses", self.losses)):
            columns |= {f"{name}.past": history.past, f"{name}.expected": history.expected}
        columns |= {"guard.present": self.guard.present, "guard.surprising": self.guard.surprising.ravel()}
        columns["swings"] = self.swings.ravel()
        for score, spread in self.spread.items():
            columns |= {f"spread.{score}.{field}": getattr(spread, field) for field in _SPREAD_FIELDS}
        columns |= {f"alarms.{field}": getattr(self.alarms, field) for field in _ALARM_FIELDS}
        columns |= {f"drift.{field}": getattr(self.drift, field).ravel() for field in _DRIFT_FIELDS}
        for score, sums in self.drift.sums.items():
            columns |= {f"sums.{score}.{field}": getattr(sums, field).ravel() for field in _SUMS_FIELDS}
        scalars = {
            "gains": [self.gains.due_squares, self.gains.excess_squares],
            "losses": [self.losses.due_squares, self.losses.excess_squares],
            "spread_scores": sorted(self.spread),
            "sums_scores": sorted(self.drift.sums),
            "drift_first_night": self.drift.first_night,
            "drift_window": len(self.drift.new),
            "limits": list(self.limits),
            "tails": list(self.tails),
            "ratios": list(self.ratios),
        }
        return columns, scalars

    @staticmethod
    def from_columns(columns: Columns, scalars: dict[str, Any]) -> DetectorState:
        """The state that :meth:`to_columns` took apart."""
        followed, window = len(columns["drift.ids"]), int(scalars["drift_window"])
        limits, tails, ratios = (tuple(scalars[name]) for name in ("limits", "tails", "ratios"))

        def shaped(name: str, *shape: int) -> NDArray[Any]:
            return columns[name].reshape(shape)

        def sums_of(score: str) -> ScoreSums:
            shape = (2, len(limits), followed)
            parts = {field: shaped(f"sums.{score}.{field}", *shape) for field in _SUMS_FIELDS if field != "z"}
            return ScoreSums(**parts, z=shaped(f"sums.{score}.z", window, followed))

        return DetectorState(
            seen=columns["seen"],
            gains=CountHistory(columns["gains.past"], columns["gains.expected"], *scalars["gains"]),
            losses=CountHistory(columns["losses.past"], columns["losses.expected"], *scalars["losses"]),
            guard=GuardHistory(
                columns["guard.present"], shaped("guard.surprising", len(columns["guard.present"]), len(tails))
            ),
            spread={
                score: SpreadHistory(**{field: columns[f"spread.{score}.{field}"] for field in _SPREAD_FIELDS})
                for score in scalars["spread_scores"]
            },
            drift=DriftMemory(
                ids=columns["drift.ids"],
                sums={score: sums_of(score) for score in scalars["sums_scores"]},
                new=shaped("drift.new", window, followed),
                lost=shaped("drift.lost", window, followed),
                due=shaped("drift.due", window, followed),
                first_night=int(scalars["drift_first_night"]),
            ),
            alarms=DriftAlarms(**{field: columns[f"alarms.{field}"] for field in _ALARM_FIELDS}),
            renamed=columns["renamed"],
            renamed_on=columns["renamed_on"],
            swings=columns["swings"].reshape(-1, len(ratios)),
            limits=limits,
            tails=tails,
            ratios=ratios,
        )


def tails_of(thresholds: Thresholds) -> tuple[float, ...]:
    """The tail exponents that are tried, in order."""
    return (thresholds.surge.tail, *thresholds.tail_guard.tails)


_SPREAD_FIELDS = ("night", "band", "bin", "count", "squares")
_ALARM_FIELDS = ("night", "node", "direction", "limit")
_DRIFT_FIELDS = ("ids", "new", "lost", "due")
_SUMS_FIELDS = ("total", "octaves", "start_rank", "nights", "z")
