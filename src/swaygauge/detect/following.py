"""Taking the sums behind drift one night further, for the nodes that are followed."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from swaygauge.detect.spread import SpreadHistory, band_spread
from swaygauge.detect.state import DetectorState, DriftMemory
from swaygauge.detect.sums import SIGN, ScoreSums
from swaygauge.detect.thresholds import Drift, Thresholds
from swaygauge.detect.view import LinkCounts, ScoreView, watched
from swaygauge.moves import depth_band
from swaygauge.records import Flags, Floats, Ids

LEAST_SPREAD: Final = 1e-9  # below this a band does not move, and there is no unit to measure a node in


@dataclass(frozen=True)
class DriftStep:
    """The sums after tonight, before any of them is reset, and which of them raise the alarm."""

    memory: DriftMemory
    alarm: dict[str, Flags]  # score name -> (d, h, k): directions, limits, followed nodes


def advance_sums(
    views: Mapping[str, ScoreView],
    state: DetectorState,
    *,
    number: int,
    running: bool,
    links: LinkCounts,
    due: Floats,
    watch_ids: Ids,
    thresholds: Thresholds,
) -> DriftStep:
    """One more night. Unless ``running``, only the link counts are remembered and the sums stay as they are."""
    old, options = state.drift, thresholds.drift
    ids = _followed(views, watch_ids, thresholds)
    empty = ScoreSums.empty(len(options.limits), options.window, len(old.ids))
    sums: dict[str, ScoreSums] = {}
    alarm: dict[str, Flags] = {}
    for name, view in views.items():
        usual = np.zeros(len(ids))
        if running:
            usual = _usual_change(state.spread.get(name), view.rank_before[ids], winsor=options.winsor)
        sums[name] = (
            old.sums.get(name, empty)
            .follow(old.ids, ids)
            .step(
                view.deviation[ids],
                usual,
                view.rank_before[ids],
                view.rank_now[ids],
                clip=options.clip,
                allowance=options.allowance,
            )
        )
        near = watched(sums[name].start_rank, view.rank_now[ids], thresholds.watch_rank) | np.isin(ids, watch_ids)
        alarm[name] = near & _crossed(sums[name], options)
    memory = DriftMemory(
        ids=ids,
        sums=sums,
        new=_extend(old.new, old.ids, ids, links.new[ids]),
        lost=_extend(old.lost, old.ids, ids, links.lost[ids]),
        due=_extend(old.due, old.ids, ids, due[ids]),
        first_night=number if running and old.first_night < 0 else old.first_night,
    )
    return DriftStep(memory, alarm)


def _followed(views: Mapping[str, ScoreView], watch_ids: Ids, thresholds: Thresholds) -> Ids:
    """Sorted ids of present nodes that stand within reach of the watched places under some score, or are on the list.

    A node's place is here the last of those it is tied for: the great block of ties in the tail is not followed.
    """
    near = np.zeros(0, np.int64)
    reach = thresholds.drift.reach * thresholds.watch_rank
    for view in views.values():
        last = view.rank_now + np.bincount(view.rank_now)[view.rank_now] - 1
        here = view.rank_now > 0
        near = np.union1d(near, np.flatnonzero(here & (last <= reach)))
        near = np.union1d(near, watch_ids[here[watch_ids]])
    ids: Ids = near.astype(np.int32)
    return ids


def _usual_change(history: SpreadHistory | None, rank_before: Ids, *, winsor: float) -> Floats:
    """(k,) the spread of each node's depth band before tonight; 0 where there is no unit."""
    if history is None or len(rank_before) == 0:
        return np.zeros(len(rank_before))
    band = depth_band(rank_before)
    usual = band_spread(history, bands=int(band.max()) + 1, winsor=winsor)[band]
    return np.where(usual >= LEAST_SPREAD, usual, 0.0)


def _crossed(sums: ScoreSums, options: Drift) -> Flags:
    """(d, h, k) sums above their limit whose node's rank also moved as far as asked, that way."""
    limits = np.array(options.limits)[:, None]
    far = np.array(SIGN)[:, None, None] * sums.octaves >= np.log2(options.ratio)
    crossed: Flags = (sums.total > limits) & far
    return crossed


def _extend(window: NDArray[Any], old_ids: Ids, ids: Ids, tonight: NDArray[Any]) -> NDArray[Any]:
    """(w, k) trailing nights of the followed nodes, tonight as the last; a node new among them starts with zeros."""
    _, was, at = np.intersect1d(old_ids, ids, assume_unique=True, return_indices=True)
    extended = np.zeros((len(window), len(ids)), window.dtype)
    extended[:-1, at] = window[1:, was]
    extended[-1] = tonight
    return extended
