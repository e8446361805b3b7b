"""Named rows and their ids -> the night's Snapshot: distinct links in one order, whatever the order of rows was."""

from __future__ import annotations

from datetime import date
from typing import Literal

import numpy as np

from swaygauge.errors import BadRows, NoLinks
from swaygauge.readers.raw import RawLinks
from swaygauge.records import Floats, Ids, Ints, Snapshot, frozen


def make_snapshot(
    night: date,
    raw: RawLinks,
    *,
    ids: Ids,
    self_links: Literal["leave_out", "keep"] = "leave_out",
    fetched: Ids | None = None,
) -> Snapshot:
    """The snapshot, sorted by (target, source).

    ids: (k,) the id of each of ``raw.names``; two names may share one (aliases). fetched: ids of the sources that are
    known to have been fetched, in any order; None = not known.

    Weights of equal links are added from the smallest to the largest, so any order of rows gives the same bytes. Good
    rows = links + duplicates, plus the self-links where they are left out.

    Raises NoLinks when nothing but self-links is there to leave out, BadRows when added weights overflow.
    """
    key = (ids[raw.target_code].astype(np.int64) << 32) | ids[raw.source_code]
    rows = len(key)
    if raw.weight is None:
        key.sort()
        key = key[_first_of_run(key)]
        weight = None
    else:
        key, weight = _added(key, raw.weight)
        if not np.isfinite(weight).all():
            at = int(np.argmin(np.isfinite(weight)))
            raise BadRows(raw.origin.file, 1, [_overflow(raw, ids, int(key[at]))])
    duplicates = rows - len(key)
    source, target = (key & 0xFFFFFFFF).astype(np.int32), (key >> 32).astype(np.int32)
    own = source == target
    if self_links == "leave_out" and own.any():
        source, target = source[~own], target[~own]
        weight = None if weight is None else weight[~own]
    if not len(source):
        raise NoLinks(
            f"{raw.origin.file}: every link goes from a node to itself; expected at least one between two nodes. "
            f"Set reader.self_links = 'keep' to score such links."
        )
    return Snapshot(
        night=night,
        source=frozen(source),
        target=frozen(target),
        weight=None if weight is None else frozen(weight),
        origin=raw.origin,
        duplicates=duplicates,
        self_links=int(own.sum()),
        fetched=None if fetched is None else frozen(np.unique(fetched).astype(np.int32)),
    )


def _first_of_run(key: Ints) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    first = np.ones(len(key), np.bool_)
    np.not_equal(key[1:], key[:-1], out=first[1:])
    return first


def _added(key: Ints, weight: Floats) -> tuple[Ints, Floats]:
    """Sorted distinct keys and the sum of each key's weights, smallest first."""
    order = np.argsort(key)  # equal keys fall in any order here; their weights are ordered below
    key, weight = key[order], weight[order]
    first = _first_of_run(key)
    if first.all():
        return key, weight
    again = ~first
    repeated = again.copy()  # rows of a link that has more than one
    repeated[:-1] |= again[1:]
    several = np.flatnonzero(repeated)
    weight[several] = weight[several[np.lexsort((weight[several], key[several]))]]
    with np.errstate(over="ignore"):
        return key[first], np.add.reduceat(weight, np.flatnonzero(first))


def _overflow(raw: RawLinks, ids: Ids, key: int) -> str:
    source, target = (str(raw.names[int(np.flatnonzero(ids == end)[0])]) for end in (key & 0xFFFFFFFF, key >> 32))
    return f"the weights of the link {source!r} -> {target!r} add up to more than a float64 can hold"
