"""Which nodes and which new links carry a jump of the spectral radius.

A few dozen accounts that all endorse each other can lift lambda, and with it decide how far score travels for
everybody. The strong component that attains lambda names too much: a ring tied to the core is inside the core. What
tells the ring apart is how much each *new* link adds to lambda.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial

import numpy as np

from swaygauge.records import Flags, Floats, Ids, Ints, LinkChanges, SpectralBounds


@dataclass(frozen=True)
class LeadingPair:
    """The leading eigenvectors of tonight's network and a way to ask what lambda would be with less.

    With A[u, v] the weight of u -> v: A' right = lambda right (what eigenvector centrality is), A left = lambda left;
    both non-negative, of any scale, over sorted ``ids``. lambda_without(rows): lambda when what was added on these
    rows (m,) of the LinkChanges is left out.
    """

    ids: Ids
    right: Floats
    left: Floats
    lambda_without: Callable[[Flags], float]


@dataclass(frozen=True)
class Ring:
    """The nodes that carry a jump, heaviest first, and the added links among them."""

    nodes: Ids
    mass: Floats  # (k,) each node's part of the first-order gain of lambda
    rows: Flags  # (m,) over the LinkChanges: what to set aside
    lambda_without: float  # with those rows left out
    enough: bool  # whether that brings lambda back to the allowed level


def is_lambda_jump(before: SpectralBounds, now: SpectralBounds, *, jump: float) -> bool:
    """Whether lambda is proven to have risen by more than ``jump``; a first cycle in an acyclic network counts."""
    return now.lower > (1.0 + jump) * before.upper


def name_ring(
    changes: LinkChanges,
    pair: LeadingPair,
    lambda_before: float,
    *,
    back_to: float = 1.01,
    or_to: float = 1.03,
    least_mass: float = 0.25,
) -> Ring:
    """The fewest nodes whose added mutual links explain the jump, closed to all nodes of similar weight.

    An added link u -> v of weight w lifts lambda by w right_u left_v / left.right in the first order. A node's mass is
    the sum over its added links in and out. The smallest prefix of nodes by mass whose mutual added links, left out,
    bring lambda to ``back_to`` x ``lambda_before`` or less sets the threshold: ``least_mass`` of the last node's mass.
    All added links between nodes above it are named. Everyday growth can exceed ``back_to`` by itself; where getting
    there would take nodes that hardly matter (below ``least_mass`` squared of the heaviest), ``or_to`` is aimed at.
    About 2 log2(size of the ring) eigenvalue runs per level.
    """
    added = (changes.after > changes.before) & ~changes.coverage
    rows = np.flatnonzero(added)
    ids, at = np.unique(np.concatenate((changes.source[rows], changes.target[rows])), return_inverse=True)
    mass = np.bincount(at, weights=np.tile(_gains(changes, pair, rows), 2), minlength=len(ids)).astype(np.float64)
    order = np.lexsort((ids, -mass))
    place = np.empty(len(ids), np.int64)
    place[order] = np.arange(len(ids))
    reach = np.zeros(len(changes.source), np.int64)  # a row is among the first k nodes when reach < k
    reach[rows] = np.maximum(place[at[: len(rows)]], place[at[len(rows) :]])
    falling = mass[order]

    def lambda_of(first: int) -> float:
        return pair.lambda_without(added & (reach < first))

    def is_enough(allowed: float, first: int) -> bool:
        return lambda_of(first) <= allowed

    size, level = 0, back_to
    for level in (back_to, or_to):
        needed = _smallest(partial(is_enough, level * lambda_before), len(ids))
        size = int(np.count_nonzero(falling >= least_mass * falling[needed - 1])) if needed else 0
        if needed and falling[needed - 1] >= least_mass**2 * falling[0]:
            break
    without = lambda_of(size)
    return Ring(
        nodes=ids[order[:size]].astype(np.int32),
        mass=falling[:size],
        rows=added & (reach < size),
        lambda_without=without,
        enough=without <= level * lambda_before,
    )


def _gains(changes: LinkChanges, pair: LeadingPair, rows: Ints) -> Floats:
    """What each of these added links adds to lambda in the first order."""
    product = float(np.sum(pair.left * pair.right))
    gain = (changes.after - changes.before)[rows] * _at(pair, pair.right, changes.source[rows])
    gain *= _at(pair, pair.left, changes.target[rows])
    scaled: Floats = gain / product if product > 0.0 else gain
    return scaled


def _smallest(holds: Callable[[int], bool], largest: int) -> int:
    """The smallest size up to ``largest`` for which a condition, once true always true, holds; else ``largest``."""
    low, high = 0, 1
    while high < largest and not holds(high):
        low, high = high, 2 * high
    high = min(high, largest)
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if holds(middle) else (middle, high)
    return high


def _at(pair: LeadingPair, vector: Floats, nodes: Ids) -> Floats:
    """The vector's entries of these nodes; 0 for nodes it does not know."""
    if len(pair.ids) == 0:
        return np.zeros(len(nodes))
    at = np.minimum(np.searchsorted(pair.ids, nodes), len(pair.ids) - 1)
    entries: Floats = np.where(pair.ids[at] == nodes, vector[at], 0.0)
    return entries
