"""Why a source has no links tonight: it departed, or it was only not fetched."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Final

import numpy as np
from annotated_types import Ge, Gt, Le

from swaygauge.overlap import Overlap
from swaygauge.records import Flags, LinkBook, Snapshot, Verdict

ROUNDING: Final = 1e-9  # so that a loss of exactly the stated share counts


@dataclass(frozen=True)
class UpkeepOptions:
    """How long missing links stand. Defaults as measured on simulated crawls; common practice, no other source."""

    carry_nights: Annotated[int, Ge(0), Le(200)] = 7  # accepted nights that an unfetched source's links stand
    debounce: Annotated[int, Ge(0), Le(1)] = 1  # 1: a link missing once from a fetched source stands; 0: gone at once
    memory: Annotated[int, Ge(1), Le(200)] = 30  # accepted nights within which a link that comes back is not new
    departed_links: Annotated[int, Ge(1)] = 3  # in-links before, below which nothing is said about a departure
    departed_loss: Annotated[float, Gt(0), Le(1)] = 0.8  # share of in-links lost that makes an empty source departed
    expiry_sources: Annotated[int, Ge(1)] = 5  # carried sources that expire in one night, from which it is coverage
    expiry_share: Annotated[float, Ge(0), Le(1)] = 0.002  # and more than this share of last night's links with them
    return_share: Annotated[float, Ge(0), Le(1)] = 0.005  # of tonight's links known from before: above it is coverage


@dataclass(frozen=True)
class Absence:
    """What is inferred about the sources tonight, per node id."""

    departed: Flags  # (size,)
    unfetched: Flags  # (size,) had links in effect, none tonight, and that is put down to the crawl
    clipped: Flags  # (size,) fetched, but the list looks cut short: what is missing from it is not lost

    @classmethod
    def none(cls, size: int) -> Absence:
        """Nothing inferred."""
        no = np.zeros(size, dtype=np.bool_)
        return cls(departed=no, unfetched=no, clipped=no)


def infer(book: LinkBook, snapshot: Snapshot, verdict: Verdict, *, match: Overlap, options: UpkeepOptions) -> Absence:
    """Read the absences of ``snapshot`` against ``book`` (``match`` is their overlap).

    Without a fetch list a source with two or more links before and none tonight is departed when it had
    ``departed_links`` in-links and lost ``departed_loss`` of them, else unfetched. In-links from sources that are
    themselves empty tonight are no evidence: a site that is down takes its neighbours' endorsements with it. A fetch
    list decides instead which sources were not fetched. On a degraded night no departure is inferred, one-link sources
    count as unfetched too, and with ``verdict.capped`` cut and shrunk lists are taken as clipped.
    """
    degraded = verdict.outcome == "repair"
    if match.fetched is None:
        empty = match.emptied(1) if degraded else match.emptied()
        silent = empty
    else:
        silent = (match.before > 0) & ~match.fetched
        empty = match.emptied() & match.fetched

    no = np.zeros(len(match.now), dtype=np.bool_)
    departed = no if degraded else empty & _deserted(book, snapshot, silent=silent, options=options)
    return Absence(
        departed=departed,
        unfetched=silent & ~departed,
        clipped=match.cut() | match.shrunk() if verdict.capped else no,
    )


def _deserted(book: LinkBook, snapshot: Snapshot, *, silent: Flags, options: UpkeepOptions) -> Flags:
    """(size,) nodes that lost their in-links, as far as sources that are not ``silent`` tell."""
    size = len(silent)
    telling = book.in_effect & ~silent[book.source]
    before = np.bincount(book.target[telling], minlength=size)
    now = np.bincount(snapshot.target, minlength=size)
    return (before >= options.departed_links) & (before - now >= options.departed_loss * before - ROUNDING)
