"""Tonight's moves and link changes laid out over the whole id range, so that everything lines up by node."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from swaygauge.detect.thresholds import Thresholds
from swaygauge.records import EXPIRED, LOST, NEW, RETURNED, Flags, Floats, Ids, Ints, LinkChanges, Moves


@dataclass(frozen=True)
class ScoreView:
    """One score's moves over the whole id range (nodes,): rank 0 and NaN where the node was absent."""

    score: str
    rank_before: Ids
    rank_now: Ids
    value_before: Floats
    value_now: Floats
    octaves: Floats
    deviation: Floats
    watched: Flags  # better rank of the two nights within the watched places, or on the watch list


@dataclass(frozen=True)
class LinkCounts:
    """How many links into each node (nodes,) are new, back, gone or expired tonight."""

    new: Ints
    returned: Ints
    lost: Ints
    expired: Ints


def lay_out(moves: Moves, nodes: int, watch_ids: Ids, thresholds: Thresholds) -> ScoreView:
    """One score's moves by node id."""
    ranks = np.zeros((2, nodes), np.int32)
    ranks[0, moves.ids], ranks[1, moves.ids] = moves.rank_before, moves.rank_now
    near = watched(ranks[0], ranks[1], thresholds.watch_rank)
    near[watch_ids] = True

    def placed(values: Floats) -> Floats:
        over_all = np.full(nodes, np.nan)
        over_all[moves.ids] = values
        return over_all

    return ScoreView(
        score=moves.score,
        rank_before=ranks[0],
        rank_now=ranks[1],
        value_before=placed(moves.value_before),
        value_now=placed(moves.value_now),
        octaves=placed(moves.octaves),
        deviation=placed(moves.deviation),
        watched=near,
    )


def watched(rank_before: Ids, rank_now: Ids, watch_rank: int) -> Flags:
    """Whether the better of two ranks is a watched place (rank 0 = absent), elementwise."""
    near: Flags = ((rank_before > 0) & (rank_before <= watch_rank)) | ((rank_now > 0) & (rank_now <= watch_rank))
    return near


def count_changes(changes: LinkChanges, nodes: int) -> LinkCounts:
    """The changes by target and kind; those that only tell of the crawl are no news and not counted."""
    new, returned, lost, expired = (
        np.bincount(changes.target[(changes.kind == kind) & ~changes.coverage], minlength=nodes).astype(np.int64)
        for kind in (NEW, RETURNED, LOST, EXPIRED)
    )
    return LinkCounts(new, returned, lost, expired)
