"""What a study takes from the store: a night's graph, the quiet nights, the bounds that hold on all of them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import date
from itertools import pairwise

import numpy as np

from swaygauge.errors import NotInStore
from swaygauge.graph import Graph
from swaygauge.night.scoring import own_importance
from swaygauge.night.steps import graph_of
from swaygauge.night.work import Work
from swaygauge.records import Floats, Ids, LinkBook, Profile, SpectralBounds
from swaygauge.scores import SCORES
from swaygauge.store import queries
from swaygauge.store.rows import NightRow

TRAILING = 14  # fine nights that the flicker rate is measured on, as many as the checks look back


@dataclass(frozen=True, eq=False)
class NightGraph:
    """The effective links of one night, ready to be solved under any setting."""

    night: date
    ids: Ids  # (n,) sorted node ids, by position in the graph
    graph: Graph
    beta: Mapping[str, Floats]  # score -> (n,) own importance
    weight: float  # of a typical link: the median, 1 when links are unweighted


@dataclass(frozen=True)
class Flicker:
    """How many links of fetched sources a night's crawl misses."""

    rate: float  # median over the nights
    lowest: float
    highest: float
    nights: int  # fine nights it was measured on


def night_row(work: Work, night: date | None) -> NightRow:
    """The scored night asked for, or the newest one. Raises NotInStore."""
    rows = [row for row in work.store.nights(work.network) if row.state == "published"]
    if not rows:
        raise NotInStore(f"{work.network}: no scored night is stored yet. Run: swaygauge night {work.network}")
    found = [row for row in rows if night in (None, row.night)]
    if not found:
        raise NotInStore(
            f"{work.network}: night {night} is not stored as a scored night. Scored nights go from {rows[0].night} to "
            f"{rows[-1].night}; see them with: swaygauge nights {work.network}"
        )
    return found[-1]


def load_night(work: Work, night: date) -> NightGraph:
    """One night's graph, with each score's own importance per node."""
    book = work.store.record(LinkBook, work.network, night, kind="book")
    scored = graph_of(book)
    n = len(scored.ids)
    beta = {
        name: np.array(
            np.broadcast_to(own_importance(work, night, scored.ids, getattr(work.settings.scores, name).beta), n),
            np.float64,
        )
        for name in SCORES
    }
    weight = 1.0 if book.weight is None or not book.in_effect.any() else float(np.median(book.weight[book.in_effect]))
    return NightGraph(night, scored.ids, scored.graph, beta, weight)


def quiet_pairs(work: Work, night: date, *, count: int) -> list[tuple[date, date]]:
    """The newest ``count`` pairs of neighbouring quiet nights up to ``night``, oldest first.

    Both accepted as fine, none missing between, and no alert about the network as a whole on the later one.
    """
    rows = [row for row in work.store.nights(work.network) if row.accepted and row.night <= night]
    alerts = queries.alerts(work.store.catalog.ask, work.network, first=date.min, last=night)
    loud = {alert.night for alert in alerts if alert.node < 0}
    pairs = [
        (before.night, now.night)
        for before, now in pairwise(rows)
        if _is_fine(before) and _is_fine(now) and now.gap_nights == 0 and now.night not in loud
    ]
    return pairs[max(len(pairs) - count, 0) :]


def bounds_over(work: Work, nights: Sequence[date]) -> SpectralBounds:
    """Bounds on lambda that hold on every one of the nights (the largest of each side)."""
    told = work.store.records(SpectralBounds, work.network, nights, kind="bounds").values()
    return SpectralBounds(max(bounds.lower for bounds in told), max(bounds.upper for bounds in told))


def flicker_of(work: Work, night: date) -> Flicker:
    """The share of links of fetched sources that waited (were missing for the first time), over trailing fine nights.

    Links that really ended wait for a night as well, so this is the most that the crawl can have missed. Raises
    NotInStore when there is no fine night after the first, which has nothing to miss.
    """
    rows = [row for row in work.store.nights(work.network) if row.accepted and row.night <= night]
    fine = [row.night for row in rows[1:] if _is_fine(row)][-TRAILING:]
    kept_up = work.store.facts(work.network, name="upkeep", nights=fine)
    profiles = work.store.records(Profile, work.network, fine, kind="profile")
    rates = [told["waiting_links"] / (profiles[when].links + told["waiting_links"]) for when, told in kept_up.items()]
    if not rates:
        raise NotInStore(
            f"{work.network}: the flicker rate cannot be measured: no fine night up to {night} has one before it. "
            "Give a rate yourself with --rate, for example --rate 0.005."
        )
    return Flicker(float(np.median(rates)), min(rates), max(rates), len(rates))


def _is_fine(row: NightRow) -> bool:
    return row.outcome == "fine" and not row.coverage_step
