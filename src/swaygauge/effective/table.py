"""The book of last night with tonight's unknown links put in: one sorted table, every column over the same rows."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from swaygauge.effective.absence import Absence, UpkeepOptions
from swaygauge.overlap import Overlap, spliced
from swaygauge.records import (
    CARRIED,
    EXPIRED,
    GONE,
    LOST,
    NEW,
    RETURNED,
    REWEIGHTED,
    SEEN,
    SHELVED,
    WAITING,
    Codes,
    Flags,
    Floats,
    Ids,
    LinkBook,
    LinkChanges,
    Snapshot,
    frozen,
)

UNKNOWN: Final = 9  # state before of a link that was in no row of the book
LONGEST: Final = 255  # nights that ``absent`` can count; it stays there


@dataclass(frozen=True)
class Table:
    """Rows sorted by (target, source)."""

    source: Ids
    target: Ids
    weight: Floats | None  # tonight's where seen, else the last known one
    last: Floats | None  # the weight before
    seen: Flags  # in tonight's snapshot
    before: Codes  # state last night, or UNKNOWN
    absent: Codes  # as of tonight

    @property
    def was_in_effect(self) -> Flags:
        """(rows,) which links were scored last night."""
        return self.before < GONE


def joined(book: LinkBook, snapshot: Snapshot, match: Overlap) -> Table:
    """Put the links of ``snapshot`` that ``book`` does not know between its rows."""
    new = ~match.known
    at = match.at[new]
    zero = np.zeros(len(at), dtype=np.uint8)
    absent = np.minimum(book.absent, LONGEST - 1) + np.uint8(1)
    absent[match.seen] = 0
    weight: Floats | None = None
    last: Floats | None = None
    if book.weight is not None and snapshot.weight is not None:
        tonight = book.weight.copy()
        tonight[match.at[match.known]] = snapshot.weight[match.known]
        weight = spliced(tonight, snapshot.weight[new], at)
        last = spliced(book.weight, snapshot.weight[new], at)
    return Table(
        source=spliced(book.source, snapshot.source[new], at),
        target=spliced(book.target, snapshot.target[new], at),
        weight=weight,
        last=last,
        seen=spliced(match.seen, np.ones(len(at), dtype=np.bool_), at),
        before=spliced(book.state, zero + np.uint8(UNKNOWN), at),
        absent=spliced(absent, zero, at),
    )


def states(table: Table, absence: Absence, options: UpkeepOptions) -> tuple[Codes, Flags]:
    """Tonight's state of every row, and which rows leave because they were carried long enough."""
    missing = table.was_in_effect & ~table.seen
    standing = missing & ~absence.departed[table.source] & ~absence.departed[table.target]
    unsure = standing & (absence.unfetched | absence.clipped)[table.source]
    expired = unsure & (table.absent > options.carry_nights)
    waited = table.before == WAITING

    state = np.full(len(missing), GONE, dtype=np.uint8)
    state[table.before == SHELVED] = SHELVED
    state[unsure & ~expired] = CARRIED
    state[unsure & ~expired & waited] = WAITING  # missing once already; the second look is still to come
    if options.debounce:
        state[standing & ~unsure & ~waited] = WAITING
    state[table.seen] = SEEN
    return state, expired


def shelved(table: Table) -> Codes:
    """The states of a new baseline: what is seen is in effect, everything else is shelved."""
    return np.where(table.seen, SEEN, SHELVED).astype(np.uint8)


def changes(table: Table, state: Codes, expired: Flags) -> LinkChanges:
    """The rows whose link took effect, went out of it, or changed its weight. ``coverage`` is all False."""
    before, after = table.was_in_effect, state < GONE
    changed = before != after
    if table.weight is not None:
        changed |= before & after & (table.weight != table.last)
    rows = np.flatnonzero(changed)

    kind = np.full(len(rows), REWEIGHTED, dtype=np.uint8)
    kind[~before[rows]] = RETURNED
    kind[table.before[rows] == UNKNOWN] = NEW
    kind[~after[rows]] = LOST
    kind[expired[rows]] = EXPIRED
    return LinkChanges(
        source=frozen(table.source[rows]),
        target=frozen(table.target[rows]),
        kind=frozen(kind),
        before=frozen(np.where(before[rows], 1.0 if table.last is None else table.last[rows], 0.0)),
        after=frozen(np.where(after[rows], 1.0 if table.weight is None else table.weight[rows], 0.0)),
        coverage=frozen(np.zeros(len(rows), dtype=np.bool_)),
    )


def book_of(table: Table, state: Codes, snapshot: Snapshot, *, memory: int) -> LinkBook:
    """The rows that are in effect, shelved, or can still come back within ``memory`` nights."""
    kept = (state != GONE) | (table.absent < memory)
    return LinkBook(
        night=snapshot.night,
        source=frozen(table.source[kept]),
        target=frozen(table.target[kept]),
        weight=None if table.weight is None else frozen(table.weight[kept]),
        state=frozen(state[kept]),
        absent=frozen(table.absent[kept]),
    )
