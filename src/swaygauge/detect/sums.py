"""The running sums behind drift, for the nodes near enough to the watched places to matter.

Two directions (up, down) times several limits h run side by side, per score. A sum that raised its alarm starts again
at zero, so the sums of different limits part ways only after an alarm.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Final

import numpy as np
from numpy.typing import NDArray

from swaygauge.detect import cusum
from swaygauge.records import Flags, Floats, Ids, Ints

UP: Final = 0
DOWN: Final = 1
SIGN: Final = (1.0, -1.0)
REPORTED: Final = -1  # stands for the limit in DriftAlarms of what was told of, whatever the limit then
BAND_WEIGHT: Final = 5.0  # how many nights of usual size a node's own roughness starts from


@dataclass(frozen=True)
class ScoreSums:
    """The sums of one score. d = 2 directions, h limits, k nodes, w nights."""

    total: Floats  # (d, h, k)
    octaves: Floats  # (d, h, k) nightly rank changes cumulated since the sum was last zero; + is a rise
    start_rank: Ids  # (d, h, k) the rank when it was
    nights: Ids  # (d, h, k) accepted nights since
    z: Floats  # (w, k) standardised changes of the trailing nights, oldest first; NaN = none

    @staticmethod
    def empty(limits: int, window: int, nodes: int = 0) -> ScoreSums:
        """All sums zero."""
        shape = (2, limits, nodes)
        return ScoreSums(
            np.zeros(shape),
            np.zeros(shape),
            np.zeros(shape, np.int32),
            np.zeros(shape, np.int32),
            np.full((window, nodes), np.nan),
        )

    def step(
        self, change: Floats, usual: Floats, rank_before: Ids, rank_now: Ids, *, clip: float, allowance: float
    ) -> ScoreSums:
        """After one more night; all arguments (k,). ``usual`` is the spread of the node's depth band; 0 = not known.

        The change is put in units of its band and, for a node that is rougher than its band, divided by the square
        root of its own roughness: half way between the band's unit and its own. Changes without a unit leave the sums
        as they are.
        """
        judged = np.isfinite(change) & (usual > 0.0)
        z = np.full(len(change), np.nan)
        z[judged] = np.clip(change[judged] / usual[judged], -clip, clip)
        rough = roughness(self.z)
        eased = np.where(judged, z / np.sqrt(np.maximum(rough, 1.0)), 0.0)
        total = self.total.copy()
        up, down = total[UP][:, judged], total[DOWN][:, judged]
        total[UP][:, judged] = cusum.step_up(up, eased[judged], allowance=allowance)
        total[DOWN][:, judged] = cusum.step_down(down, eased[judged], allowance=allowance)
        running = total > 0.0
        fresh = running & (self.total == 0.0) & (self.start_rank == 0)
        start_rank = np.where(running, np.where(fresh, rank_before, self.start_rank), rank_now)
        octaves = np.zeros(len(change))
        both = (rank_before > 0) & (rank_now > 0)
        octaves[both] = np.log2(rank_before[both] / rank_now[both])
        return ScoreSums(
            total=total,
            octaves=np.where(running, self.octaves + octaves, 0.0),
            start_rank=start_rank.astype(np.int32),
            nights=np.where(running, self.nights + 1, 0).astype(np.int32),
            z=np.vstack((self.z[1:], z)),
        )

    def reset(self, which: Flags, rank_now: Ids) -> ScoreSums:
        """With the sums of ``which`` (d, h, k) back at zero, starting from tonight's ranks (k,)."""
        return ScoreSums(
            total=np.where(which, 0.0, self.total),
            octaves=np.where(which, 0.0, self.octaves),
            start_rank=np.where(which, rank_now, self.start_rank).astype(np.int32),
            nights=np.where(which, 0, self.nights).astype(np.int32),
            z=self.z,
        )

    def follow(self, ids: Ids, wanted: Ids) -> ScoreSums:
        """The sums of ``wanted`` instead of ``ids`` (both sorted); nodes that are new start at zero."""
        fresh = ScoreSums.empty(self.total.shape[1], self.z.shape[0], len(wanted))
        _, old, new = np.intersect1d(ids, wanted, assume_unique=True, return_indices=True)
        for name in ("total", "octaves", "start_rank", "nights", "z"):
            getattr(fresh, name)[..., new] = getattr(self, name)[..., old]
        return fresh


def roughness(z: Floats) -> Floats:
    """(k,) root mean square of a node's own trailing changes (w, k), drawn towards 1 by five nights of usual size."""
    own: Floats = np.sqrt((BAND_WEIGHT + np.nansum(z**2, axis=0)) / (BAND_WEIGHT + np.isfinite(z).sum(axis=0)))
    return own


@dataclass(frozen=True)
class DriftAlarms:
    """First alarms of the trailing nights, all (a,): number of the night, node, direction, place of the limit;
    beside them what was told of."""

    night: Ints = field(default_factory=lambda: np.zeros(0, np.int64))
    node: Ints = field(default_factory=lambda: np.zeros(0, np.int64))
    direction: Ints = field(default_factory=lambda: np.zeros(0, np.int64))
    limit: Ints = field(default_factory=lambda: np.zeros(0, np.int64))

    def rested(self, number: int, node: NDArray[np.integer], direction: int, limit: int, *, cooldown: int) -> Flags:
        """(k,) which nodes had no first alarm of this direction and limit within the cooldown."""
        recent = (self.night > number - cooldown) & (self.direction == direction) & (self.limit == limit)
        return ~np.isin(node, self.node[recent])

    def after(self, number: int, node: Ints, direction: Ints, limit: Ints, *, window: int) -> DriftAlarms:
        """With tonight's first alarms; those older than ``window`` nights go."""
        kept = self.night > number - window
        return DriftAlarms(
            np.concatenate((self.night[kept], np.full(len(node), number, np.int64))),
            np.concatenate((self.node[kept], node)),
            np.concatenate((self.direction[kept], direction)),
            np.concatenate((self.limit[kept], limit)),
        )


def choose_limit(
    alarms: DriftAlarms, number: int, counted_nights: int, *, limits: int, first: int, budget: float, window: int
) -> int:
    """The place of the limit to use: the smallest whose first alarms stayed within the budget, else the largest.

    counted_nights: how many nights drift has run; with less than half the window, ``first`` is used.
    """
    nights = min(counted_nights, window)
    if nights < window / 2:
        return first
    recent = alarms.night >= number - nights
    for limit in range(limits):
        if np.count_nonzero(recent & (alarms.limit == limit)) <= budget * nights:
            return limit
    return limits - 1
