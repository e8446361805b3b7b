"""Changed links that tell of the crawl, not of the network, and last night as it looks without that difference."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from swaygauge.effective.absence import UpkeepOptions
from swaygauge.overlap import link_keys, spliced
from swaygauge.records import EXPIRED, NEW, RETURNED, SEEN, Flags, LinkBook, LinkChanges, frozen


def coverage_rows(
    changes: LinkChanges, *, links: tuple[int, int], options: UpkeepOptions, capped: bool = False
) -> Flags:
    """(k,) which changes to set aside when comparing nights; ``links`` in effect before and now.

    Carried links whose time is over, when at least ``expiry_sources`` sources and more than ``expiry_share`` of last
    night's links go at once: one large source that expires is news, a crawl that lost a region is not. Links that come
    back, when they are more than ``return_share`` of tonight's links; with them whatever else their sources show, if
    at least half of what such a source adds was known. With ``capped`` lists both are set aside however few: a list
    that is cut night after night shows now these, now those of its links.
    """
    before, now = links
    aside = np.zeros(len(changes.kind), dtype=np.bool_)

    expired = changes.kind == EXPIRED
    sources = len(np.unique(changes.source[expired]))
    many = sources >= options.expiry_sources and np.count_nonzero(expired) > options.expiry_share * before
    if capped or many:
        aside |= expired

    back = changes.kind == RETURNED
    if back.any() and (capped or np.count_nonzero(back) > options.return_share * now):
        added = back | (changes.kind == NEW)
        size = int(changes.source.max()) + 1
        known = np.bincount(changes.source[back], minlength=size)
        every = np.bincount(changes.source[added], minlength=size)
        resumed = (known > 0) & (2 * known >= every)
        aside |= back | (added & resumed[changes.source])
    return aside


def comparable_before(before: LinkBook, changes: LinkChanges) -> LinkBook | None:
    """Last night's links in effect without those that ``changes.coverage`` expired and with those it brought back.

    ``before`` is the book that ``changes`` started from. Re-score it to compare tonight with it like with like; the
    links it brings back have tonight's weight. None when nothing needs adjusting: last night's scores do as they are.
    """
    if not changes.coverage.any():
        return None
    gone = changes.coverage & (changes.kind == EXPIRED)
    come = changes.coverage & ~gone

    stays = before.in_effect
    keys = link_keys(before.target, before.source)
    stays[np.searchsorted(keys, link_keys(changes.target[gone], changes.source[gone]))] = False
    at = np.searchsorted(keys[stays], link_keys(changes.target[come], changes.source[come]))

    def column(old: NDArray[Any], new: NDArray[Any]) -> NDArray[Any]:
        return frozen(spliced(old[stays], new, at))

    nothing = np.zeros(len(at), dtype=np.uint8)
    return LinkBook(
        night=before.night,
        source=column(before.source, changes.source[come]),
        target=column(before.target, changes.target[come]),
        weight=None if before.weight is None else column(before.weight, changes.after[come]),
        state=column(before.state, nothing + np.uint8(SEEN)),
        absent=column(before.absent, nothing),
    )
