"""The network of one night as the solver wants it: in-link rows, strong components upstream first.

Direction is written once, here: a link source -> target endorses the target, score flows along it into the target, and
the row of a node holds the links that end at it.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from swaygauge.errors import InputError
from swaygauge.kernels import building, components
from swaygauge.kernels.threads import cut_rows, in_parts, thread_count
from swaygauge.records import Floats, Ids, Ints

NO_WEIGHT: Floats = np.empty(0, np.float64)  # stands for "every weight is 1" in kernels
NOBODY: Ids = np.empty(0, np.int32)  # stands for node numbers that are left out


@dataclass(frozen=True, eq=False)
class Block:
    """One strong component: positions low .. high - 1; the inner links of row low + i are inner[i] .. its end."""

    low: int
    high: int
    inner: Ints
    cuts: Ints


@dataclass(frozen=True, eq=False)
class Rows:
    """Rows of in-links by position; positions follow the strong components, upstream first.

    start (n + 1,) int64, source (m,) int32 ascending inside a row, weight (m,) or of length 0 when unweighted,
    component_start (components + 1,) int64: positions of component c are component_start[c] .. component_start[c+1]-1.
    """

    start: Ints
    source: Ids
    weight: Floats
    component_start: Ints
    _blocks: dict[int, Block] = field(default_factory=dict, repr=False)

    @property
    def n(self) -> int:
        """Number of positions."""
        return len(self.start) - 1

    @cached_property
    def cuts(self) -> Ints:
        """Row chunks of about equal work."""
        return cut_rows(self.start[:-1], self.start[1:])

    @cached_property
    def sources(self) -> int:
        """Positions from this one on are nobody's source."""
        return int(self.source.max()) + 1 if len(self.source) else 0

    def block(self, component: int) -> Block:
        """The inner links of one component; kept, because every solve asks again for the same few."""
        if component not in self._blocks:
            low, high = (int(at) for at in self.component_start[component : component + 2])
            inner = np.empty(high - low, np.int64)
            components.inner_links(self.start, self.source, low, high, inner)
            self._blocks[component] = Block(low, high, inner, cut_rows(inner, self.start[low + 1 : high + 1]))
        return self._blocks[component]


class Graph:
    """A directed network of nodes 0 .. n - 1, built from links in any order.

    ``source[i] -> target[i]`` endorses ``target[i]``. Repeated links are one link (their weights added); self-links
    count as given. ``weight`` (m,) float, finite and > 0, or None when every link counts 1. The same links in another
    order make the same graph, byte by byte. Raises InputError when ids or weights are not usable.

    >>> graph = Graph(4, [0, 1, 2], [1, 2, 1])
    >>> graph.m, graph.in_degree().tolist(), graph.component_count
    (3, [0, 2, 1, 0], 3)
    """

    def __init__(self, n: int, source: ArrayLike, target: ArrayLike, *, weight: ArrayLike | None = None) -> None:
        self.n = _checked_size(n)
        heads, tails = _checked_ids("source", source, self.n), _checked_ids("target", target, self.n)
        if len(heads) != len(tails):
            raise InputError(f"source has {len(heads)} entries and target {len(tails)}; expected one of each per link.")
        self.weighted = weight is not None
        given = NO_WEIGHT if weight is None else _checked_weights(weight, len(heads))
        start, column, heft = _in_rows(self.n, heads, tails, given)
        self.m = len(column)
        self._in_degree = np.diff(start).astype(np.int32)
        self._out_degree = _counted(column, self.n)
        label, count = _components(start, column, self._out_degree)
        self.component_count = count
        self.order, component_start = _order(label, count, self._out_degree)
        self.place = np.empty(self.n, np.int32)
        self.place[self.order] = np.arange(self.n, dtype=np.int32)
        new = _starts(self._in_degree[self.order])
        self.rows = Rows(new, *_sorted_links(new, start, column, NOBODY, heft, self.place), component_start)
        self._label = label

    def in_degree(self) -> Ints:
        """(n,) links that end at each node."""
        return self._in_degree.astype(np.int64)

    def out_degree(self) -> Ints:
        """(n,) links that start at each node."""
        return self._out_degree.astype(np.int64)

    def out_strength(self) -> Floats:
        """(n,) sum of the weights of the links that start at each node (its out-degree when unweighted)."""
        return self.strength[self.place]

    def component_of(self) -> Ids:
        """(n,) the strong component of each node; links lead from lower to higher numbers."""
        return self._label.copy()

    def component_sizes(self) -> Ints:
        """(components,) nodes in each strong component."""
        return np.diff(self.rows.component_start)

    @cached_property
    def strength(self) -> Floats:
        """(n,) out-strength by position, correct to two units of rounding."""
        if not self.weighted:
            return self._out_degree[self.order].astype(np.float64)
        total, carry = np.zeros(self.n), np.zeros(self.n)
        building.add_out_strength(self.rows.start, self.rows.source, self.rows.weight, total, carry)
        return total + carry

    @cached_property
    def turned(self) -> Rows:
        """Rows of out-links: position p of :attr:`rows` is position n - 1 - p here, so upstream and downstream swap."""
        rows = self.rows
        start = _starts(self._out_degree[self.order[::-1]])
        backwards = np.arange(self.n - 1, -1, -1, dtype=np.int32)
        column, weight = _sorted_links(start, rows.start, NOBODY, rows.source, rows.weight, backwards)
        return Rows(start, column, weight, self.n - rows.component_start[::-1])


def _checked_size(n: int) -> int:
    if isinstance(n, bool) or not isinstance(n, int | np.integer) or not 0 <= n < 2**31:
        raise InputError(f"number of nodes: expected an integer from 0 to 2**31 - 1, got {n!r}.")
    return int(n)


def _checked_ids(name: str, given: ArrayLike, n: int) -> Ids:
    ids: NDArray[Any] = np.asarray(given)
    if ids.ndim != 1 or (ids.size and ids.dtype.kind not in "iu"):
        raise InputError(f"{name}: expected a one-dimensional array of integers, got {ids.dtype} of shape {ids.shape}.")
    if ids.size and not 0 <= int(ids.min()) <= int(ids.max()) < n:
        raise InputError(f"{name}: expected node numbers from 0 to {n - 1}, got {ids.min()} to {ids.max()}.")
    own: Ids = np.array(ids, np.int32) if not _fits(ids, np.int32) else ids
    return own


def _checked_weights(given: ArrayLike, m: int) -> Floats:
    weights: NDArray[Any] = np.asarray(given)
    if weights.shape != (m,) or weights.dtype.kind not in "iuf":
        raise InputError(f"weight: expected {m} numbers, one per link, got {weights.dtype} of shape {weights.shape}.")
    weights = weights if _fits(weights, np.float64) else np.array(weights, np.float64)
    bad = np.flatnonzero(~((weights > 0) & (weights < np.inf)))
    if len(bad):
        raise InputError(f"weight: expected finite numbers > 0, got {weights[bad[0]]} for link {bad[0]}.")
    return weights


def _fits(array: NDArray[Any], dtype: type[np.generic]) -> bool:
    """Whether a kernel can take the array as it is (it must be of the one type that kernels are compiled for)."""
    return array.dtype == dtype and array.flags.c_contiguous and array.flags.writeable and array.flags.aligned


def _in_rows(n: int, source: Ids, target: Ids, given: Floats) -> tuple[Ints, Ids, Floats]:
    """Links grouped by target, sources ascending, repeats merged."""
    start = np.empty(n + 1, np.int64)
    building.count_rows(target, start)
    if building.is_tidy(source, target):
        return start, source, given
    column, weight = _sorted_links(start, start, source, target, given, NOBODY)
    left = building.merge_repeats(start, column, weight)
    if left < len(column):
        column, weight = column[:left].copy(), weight[: left if len(weight) else 0].copy()
    return start, column, weight


def _sorted_links(
    start: Ints, old_start: Ints, source: Ids, target: Ids, given: Floats, place: Ids
) -> tuple[Ids, Floats]:
    """Sources and weights by (target, source), nodes renumbered by ``place`` (if any); rows begin at ``start``.

    One of source and target may be left out: it is the row of ``old_start`` that holds the link.
    """
    n, m = len(start) - 1, int(start[-1])
    shift = max(0, n.bit_length() - max(0, min(9, (m >> 14).bit_length())))  # at most about 512 buckets, none tiny
    buckets = (n >> shift) + 1
    bucket = start[np.minimum(np.arange(buckets + 1) << shift, n)]
    packed, weight = np.empty(m, np.int64), np.empty_like(given)
    building.deal(old_start, source, target, given, place, shift, bucket.copy(), packed, weight)
    column = np.empty(m, np.int32)
    cuts = np.searchsorted(bucket, np.linspace(0, m, 4 * thread_count() + 1)).astype(np.int64)
    cuts[0], cuts[-1] = 0, buckets
    in_parts(building.sort_buckets, cuts, bucket, packed, weight, n.bit_length(), shift, column)
    return column, weight


def _counted(column: Ids, n: int) -> Ids:
    """(n,) how often each number occurs; np.bincount would make a copy of twice the size first."""
    start = np.empty(n + 1, np.int64)
    building.count_rows(column, start)
    return np.diff(start).astype(np.int32)


def _components(start: Ints, column: Ids, out_degree: Ids) -> tuple[Ids, int]:
    """Each node's strong component, upstream first, and how many there are."""
    n = len(out_degree)
    label, stack, entered = (np.empty(n, np.int32) for _ in range(3))
    count = components.strong_components(start, column, out_degree, label, stack, entered, np.empty(n, np.int64))
    return label, int(count)


def _order(label: Ids, count: int, degree: Ids) -> tuple[Ids, Ints]:
    """Nodes by component, inside by falling degree: the most gathered values lie close together."""
    by_degree, order = np.empty_like(label), np.empty_like(label)
    most = int(degree.max()) if len(degree) else 0
    components.sort_by_degree(degree, np.zeros(most + 2, np.int64), by_degree)
    component_start = np.empty(count + 1, np.int64)
    components.gather_components(label, by_degree, component_start, order)
    return order, component_start


def _starts(degree: Ids) -> Ints:
    start = np.zeros(len(degree) + 1, np.int64)
    np.cumsum(degree, out=start[1:])
    return start
