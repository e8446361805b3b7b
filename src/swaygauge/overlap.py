"""Last night's links in effect against tonight's raw ones: which are seen again, counted source by source.

One binary search per link over two sorted tables; no sets, no sorting. The verdict measures churn with it, and the
effective snapshot decides with it which links to carry.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from swaygauge.records import Flags, Ids, Ints, LinkBook, Snapshot

MANY: Final = 2  # links before, from which an empty list tonight says something about the source
LIST: Final = 5  # links before, from which a source's losses are read as a share
SHRINK: Final = 0.2  # a list that lost more than this share of its links has shrunk


def link_keys(target: Ids, source: Ids) -> Ints:
    """(m,) int64 ``target << 32 | source``: ascending exactly when links are sorted by (target, source).

    >>> link_keys(np.array([0, 1], np.int32), np.array([7, 2], np.int32)).tolist()
    [7, 4294967298]
    """
    return (target.astype(np.int64) << 32) | source


def spliced(old: NDArray[Any], new: NDArray[Any], at: Ints) -> NDArray[Any]:
    """``old`` with ``new[i]`` put before ``old[at[i]]``; ``at`` ascending. One pass, both orders kept.

    >>> spliced(np.array([10, 30]), np.array([20, 40]), np.array([1, 2])).tolist()
    [10, 20, 30, 40]
    """
    merged = np.empty(len(old) + len(new), dtype=old.dtype)
    places = at + np.arange(len(new))
    rest = np.ones(len(merged), dtype=np.bool_)
    rest[places] = False
    merged[places] = new
    merged[rest] = old
    return merged


@dataclass(frozen=True)
class Overlap:
    """A book of links against a snapshot. Counts are per node id (0 .. size - 1); "before" is in effect last night."""

    seen: Flags  # (book rows,) the link is in tonight's snapshot
    known: Flags  # (snapshot rows,) the link has a row in the book, in effect or remembered
    at: Ints  # (snapshot rows,) the book row the link is, or would be put before
    before: Ints  # (size,) links of a source in effect before
    again: Ints  # (size,) of these, seen tonight
    now: Ints  # (size,) links of a source tonight
    fetched: Flags | None  # (size,) sources known to have been fetched; None when there is no fetch list

    @property
    def judged(self) -> Flags:
        """(size,) sources whose losses say something: every source, or with a fetch list the fetched ones."""
        return np.ones(len(self.now), dtype=np.bool_) if self.fetched is None else self.fetched

    def emptied(self, at_least: int = MANY) -> Flags:
        """(size,) sources with ``at_least`` links before and none tonight."""
        emptied: Flags = (self.before >= at_least) & (self.now == 0)
        return emptied

    def cut(self) -> Flags:
        """(size,) sources with more links before than tonight's longest list and exactly that many tonight."""
        longest = int(self.now.max(initial=0))
        cut: Flags = self.judged & (self.now == longest) & (self.before > longest) & (self.now > 0)
        return cut

    def shrunk(self) -> Flags:
        """(size,) sources with ``LIST`` links before that lost more than ``SHRINK`` of them, but are not empty."""
        less = self.before - self.again > SHRINK * self.before
        shrunk: Flags = self.judged & less & (self.before >= LIST) & (self.now > 0)
        return shrunk


def overlap(book: LinkBook, snapshot: Snapshot) -> Overlap:
    """Match ``snapshot`` with ``book``; both sorted by (target, source)."""
    have = link_keys(book.target, book.source)
    come = link_keys(snapshot.target, snapshot.source)
    at = np.searchsorted(have, come)
    known = np.zeros(len(come), dtype=np.bool_)
    inside = at < len(have)
    known[inside] = have[at[inside]] == come[inside]
    seen = np.zeros(len(have), dtype=np.bool_)
    seen[at[known]] = True

    size = 1 + max((int(ids.max()) for ids in _ids(book, snapshot) if len(ids)), default=-1)
    standing = book.in_effect
    now = np.bincount(snapshot.source, minlength=size)
    fetched = None
    if snapshot.fetched is not None:
        fetched = now > 0  # a source with links was fetched, whatever the list says
        fetched[snapshot.fetched] = True
    return Overlap(
        seen=seen,
        known=known,
        at=at,
        before=np.bincount(book.source[standing], minlength=size),
        again=np.bincount(book.source[standing & seen], minlength=size),
        now=now,
        fetched=fetched,
    )


def _ids(book: LinkBook, snapshot: Snapshot) -> tuple[Ids, ...]:
    every = (book.source, book.target, snapshot.source, snapshot.target)
    return every if snapshot.fetched is None else (*every, snapshot.fetched)
