"""What the detector is given for one night."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date

import numpy as np

from swaygauge.detect.ring import Ring
from swaygauge.records import Ids, Ints, LinkBook, LinkChanges, Moves, SpectralBounds, Upkeep, Verdict


@dataclass(frozen=True, kw_only=True)
class NightInputs:
    """One night against the accepted night before it. A held night leaves everything below ``gap_nights`` out.

    After a coverage step, or when alpha was pinned anew, "before" is the earlier night scored again like with like, and
    ``changes``, ``in_degree_before`` and ``moves`` refer to that.
    """

    network: str
    night: date
    verdict: Verdict
    history: int  # accepted nights before this one; also the number of this night in the detector's own count
    nodes: int  # length of the network's name table; ids are below it
    previous: date | None = None  # the accepted night compared with; None on the first
    last_seen: date | None = None  # the last night with any snapshot, held ones too; None = ``previous``
    cadence_days: int = 1  # days from one expected snapshot to the next
    gap_nights: int = 0  # expected nights between ``previous`` and ``night`` without an accepted snapshot
    book: LinkBook | None = None
    changes: LinkChanges | None = None  # between the two effective snapshots compared
    upkeep: Upkeep | None = None
    in_degree_before: Ints | None = None  # (nodes,) links in effect into each node the night before
    moves: Mapping[str, Moves] = field(default_factory=dict)  # score name -> how its ranks moved
    bounds_before: SpectralBounds | None = None
    bounds_now: SpectralBounds | None = None  # of the network as crawled, with whatever is set aside
    ring: Ring | None = None  # which nodes carry a lambda jump, when that was worked out
    rescored: bool = False  # alpha was pinned anew: both nights were scored with the new one
    watch_ids: Ids = field(default_factory=lambda: np.zeros(0, np.int32))  # sorted; watched at any place


def in_degree(book: LinkBook, nodes: int) -> Ints:
    """(nodes,) how many links in effect point at each node."""
    return np.bincount(book.target[book.in_effect], minlength=nodes).astype(np.int64)


def missing_nights(previous: date, night: date, cadence_days: int = 1) -> int:
    """How many expected nights lie strictly between two dates.

    >>> missing_nights(date(2031, 3, 4), date(2031, 3, 7))
    2
    >>> missing_nights(date(2031, 3, 3), date(2031, 3, 10), cadence_days=7)
    0
    """
    return max((night - previous).days // cadence_days - 1, 0)
