"""Ranks that say only what the bounds prove."""

from __future__ import annotations

import numpy as np

from swaygauge.records import Floats, Ids


def rank_places(value: Floats, bound: Floats) -> tuple[Ids, Ids, Ids]:
    """(rank, best, worst), each (n,) int32, from values and proven error bounds, highest value first.

    rank = best = 1 + the number of nodes proven larger: value - bound above this node's value + bound. worst = the
    number of nodes not proven smaller. Nodes of equal value share all three, so do nodes that no third node separates;
    a smaller value never has a better rank. Intervals are widened where needed to make that so (a node's lower end is
    no higher than that of any node above it, its upper end no lower than that of any node below it).

    >>> [places.tolist() for places in rank_places(np.array([1.0, 5.0, 5.0, 2.0]), np.full(4, 0.1))]
    [[4, 1, 1, 3], [4, 1, 1, 3], [4, 2, 2, 3]]
    """
    order, low, high = _ladder(value, bound)
    rank = np.empty(len(value), np.int32)
    worst = np.empty(len(value), np.int32)
    falling = low[::-1]  # ascending, as searchsorted needs it
    larger = len(low) - np.searchsorted(falling, high, side="right")  # low > high of this one
    rank[order] = larger + 1
    smaller = np.searchsorted(high[::-1], low, side="left")  # high < low of this one
    worst[order] = len(high) - smaller
    return rank, rank.copy(), worst


def proven_places(value: Floats, bound: Floats) -> int:
    """How many first places are proven in order: each node apart from the next, or of exactly the same value.

    >>> proven_places(np.array([9.0, 7.0, 7.0, 3.0, 2.9]), np.full(5, 0.1))
    3
    """
    order, low, high = _ladder(value, bound)
    sorted_value = value[order]
    told = (low[:-1] > high[1:]) | (sorted_value[:-1] == sorted_value[1:])
    unclear = np.flatnonzero(~told)
    if len(unclear) == 0:
        return len(value)
    # the places of nodes that tie with an unclear one are not settled either
    return int(np.searchsorted(-sorted_value, -sorted_value[unclear[0]]))


def _ladder(value: Floats, bound: Floats) -> tuple[Ids, Floats, Floats]:
    """Nodes by falling value, with lower and upper ends that fall as well and are equal for equal values."""
    order = np.argsort(-value, kind="stable").astype(np.int32)
    falling, width = value[order], bound[order]
    low = np.minimum.accumulate(falling - width)
    high = np.maximum.accumulate((falling + width)[::-1])[::-1]
    if len(value):
        new = np.concatenate(([True], falling[1:] != falling[:-1]))
        group = np.cumsum(new) - 1
        first = np.flatnonzero(new)
        last = np.append(first[1:], len(value)) - 1
        low, high = low[last[group]], high[first[group]]
    return order, low, high
