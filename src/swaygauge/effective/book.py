"""The book of links, moved on by one accepted night at a time."""

from __future__ import annotations

import dataclasses

import numpy as np

from swaygauge.effective.absence import Absence, UpkeepOptions, infer
from swaygauge.effective.coverage import coverage_rows
from swaygauge.effective.table import book_of, changes, joined, shelved, states
from swaygauge.errors import InputError, UnclearNight
from swaygauge.overlap import overlap
from swaygauge.records import (
    CARRIED,
    EXPIRED,
    LOST,
    NEW,
    RETURNED,
    WAITING,
    Ids,
    LinkBook,
    LinkChanges,
    Snapshot,
    Upkeep,
    Verdict,
    frozen,
)


def start_book(snapshot: Snapshot) -> LinkBook:
    """The book of the first night: every link as seen, nothing carried, nothing remembered."""
    nothing = frozen(np.zeros(len(snapshot.source), dtype=np.uint8))
    return LinkBook(
        night=snapshot.night,
        source=snapshot.source,
        target=snapshot.target,
        weight=snapshot.weight,
        state=nothing,
        absent=nothing,
    )


def advance(
    book: LinkBook, snapshot: Snapshot, verdict: Verdict, *, options: UpkeepOptions | None = None
) -> tuple[LinkBook, LinkChanges, Upkeep]:
    """Move ``book`` on to the accepted ``snapshot``: what is in effect now, what changed, what was kept up.

    Nights that were held or missing in between do not count: "one night" is one accepted night. New links are in effect
    at once. A missing link of a fetched source stands until the source is fetched again without it (debounce), of an
    unfetched source for ``carry_nights`` with its last weight, and of a departed source or target not at all. With
    ``verdict.rebaselined`` the snapshot stands alone and every other link is shelved: remembered without end.

    Raises UnclearNight when the snapshot is not later than the book, InputError when it was held or when only one of
    the two has weights.
    """
    options = options or UpkeepOptions()
    _refuse_misfit(book, snapshot, verdict)
    match = overlap(book, snapshot)
    absence = infer(book, snapshot, verdict, match=match, options=options)
    table = joined(book, snapshot, match)
    if verdict.rebaselined:
        absence = Absence.none(len(match.now))
        state, expired = shelved(table), np.zeros(len(table.seen), dtype=np.bool_)
    else:
        state, expired = states(table, absence, options)

    after = book_of(table, state, snapshot, memory=options.memory)
    moved = changes(table, state, expired)
    if not verdict.rebaselined:
        links = (int(np.count_nonzero(book.in_effect)), int(np.count_nonzero(after.in_effect)))
        aside = coverage_rows(moved, links=links, options=options, capped=verdict.capped)
        moved = dataclasses.replace(moved, coverage=frozen(aside))
    return after, moved, _counted(after, moved, absence, verdict)


def _refuse_misfit(book: LinkBook, snapshot: Snapshot, verdict: Verdict) -> None:
    if snapshot.night <= book.night:
        raise UnclearNight(
            f"night {snapshot.night} is not later than {book.night}, the last accepted one; nights are taken up in "
            f"date order. Replay from {snapshot.night} on to fit a late snapshot in."
        )
    if verdict.outcome == "hold":
        raise InputError(
            f"night {snapshot.night} was held, so nothing of it takes effect. Accept it with a reason to use it anyway."
        )
    if (book.weight is None) != (snapshot.weight is None):
        has, had = ("no weights", "weights") if snapshot.weight is None else ("weights", "none")
        raise InputError(
            f"night {snapshot.night} has {has}, but the nights up to {book.night} had {had}. "
            "Set the weight column as it was, or start a new network."
        )


def _counted(book: LinkBook, moved: LinkChanges, absence: Absence, verdict: Verdict) -> Upkeep:
    carried = book.state == CARRIED
    kinds = np.bincount(moved.kind, minlength=EXPIRED + 1)
    return Upkeep(
        carried_links=int(np.count_nonzero(carried)),
        carried_sources=len(np.unique(book.source[carried])),
        waiting_links=int(np.count_nonzero(book.state == WAITING)),
        returned_links=int(kinds[RETURNED]),
        new_links=int(kinds[NEW]),
        lost_links=int(kinds[LOST]),
        expired_links=int(kinds[EXPIRED]),
        departed=_ids(absence.departed),
        unfetched=_ids(absence.unfetched),
        coverage_step=verdict.starts_baseline,
        coverage_links=int(np.count_nonzero(moved.coverage)),
    )


def _ids(flags: np.ndarray[tuple[int], np.dtype[np.bool_]]) -> Ids:
    return frozen(np.flatnonzero(flags).astype(np.int32))
