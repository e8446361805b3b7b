"""The measured facts of one raw snapshot, against the book of the last accepted night."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Final

import numpy as np

from swaygauge.overlap import LIST, MANY, Overlap, overlap
from swaygauge.records import CARRIED, Flags, Ids, LinkBook, Profile, Snapshot

HUBS: Final = 100  # how many of the largest sources count as hubs
TRAILING: Final = 14  # accepted nights that node and link ratios are taken over


def measure(
    snapshot: Snapshot,
    book: LinkBook | None,
    *,
    trailing: Sequence[Profile] = (),
    known_nodes: Ids | None = None,
) -> Profile:
    """Measure ``snapshot`` (raw) against ``book`` (last accepted night; None on a first night).

    ``trailing``: profiles of the accepted nights since the last baseline, oldest first; the last 14 count.
    ``known_nodes``: ids seen on any accepted night, or None when that is not known. Raises ValueError when there is a
    book without a trailing profile, or profiles without a book.

    Where a fetch list says what was fetched, kept, lost, hub, cut and shrunk are over fetched sources only and
    ``unfetched`` tells the rest: three states, not a loss. A share of nothing is 0 (kept: 1). A source most of whose
    links were carried already last night is no hub: its loss was measured on the night it was lost.

    NumPy on the sorted columns, not DuckDB: at 1e6 links the counts and the churn took 0.07 s against 0.27 s for one
    DuckDB query over the same arrays, at 1e7 links 0.66 s against 2.5 s (two cores, best of three).
    """
    if (book is None) != (len(trailing) == 0):
        raise ValueError("a book and at least one trailing profile belong together; the first night has neither")
    links = len(snapshot.source)
    size = 1 + max(int(snapshot.source.max(initial=-1)), int(snapshot.target.max(initial=-1)))
    out = np.bincount(snapshot.source, minlength=size)
    present = out > 0
    sources = int(np.count_nonzero(present))
    targets = np.bincount(snapshot.target, minlength=size) > 0
    present |= targets
    nodes = int(np.count_nonzero(present))
    weight = snapshot.weight

    facts: dict[str, Any] = dict.fromkeys(("kept", "lost", "hub", "cut", "shrunk", "node_ratio", "link_ratio"))
    if book is not None:
        facts |= _churn(overlap(book, snapshot), book)
        recent = trailing[-TRAILING:]
        base = float(np.median([p.nodes for p in recent]))
        facts |= {
            "base_nodes": base,
            "node_ratio": nodes / base,
            "link_ratio": links / float(np.median([p.links for p in recent])),
        }
    return Profile(
        night=snapshot.night,
        rows=snapshot.origin.rows,
        links=links,
        nodes=nodes,
        sources=sources,
        targets=int(np.count_nonzero(targets)),
        duplicates=snapshot.duplicates,
        self_links=snapshot.self_links,
        dropped=sum(count for _, count in snapshot.origin.dropped),
        weight_min=1.0 if weight is None else float(weight.min()),
        weight_max=1.0 if weight is None else float(weight.max()),
        weight_sum=float(links) if weight is None else float(weight.sum()),
        longest_list=int(out.max(initial=0)),
        new_nodes=None if known_nodes is None else _share_new(present, known_nodes),
        history=min(len(trailing), TRAILING),
        fetch_list=snapshot.fetched is not None,
        **facts,
    )


def _churn(match: Overlap, book: LinkBook) -> dict[str, Any]:
    judged = match.judged
    many = match.before >= MANY
    lists = judged & (match.before >= LIST)
    carried = np.bincount(book.source[book.state == CARRIED], minlength=len(match.before))
    hubs = _largest(match, lists & (2 * carried <= match.before))  # one that is gone since earlier was told of then
    base = int(match.before[judged].sum())
    return {
        "kept": int(match.again[judged].sum()) / base if base else 1.0,
        "lost": _share(match.emptied(), many & judged),
        "hub": _share(2 * match.again < match.before, hubs),
        "cut": int(np.count_nonzero(match.cut())),
        "shrunk": _share(match.shrunk(), lists),
        "unfetched": None if match.fetched is None else _share(~judged, many),
        "base_links": base,
        "base_sources": int(np.count_nonzero(many & judged)),
        "base_hubs": int(np.count_nonzero(hubs)),
        "base_lists": int(np.count_nonzero(lists)),
    }


def _largest(match: Overlap, lists: Flags) -> Flags:
    """The sources with the longest of ``lists``: a source with a handful of links is no hub, however few there are."""
    ids = np.flatnonzero(lists)
    hubs = np.zeros(len(lists), dtype=np.bool_)
    hubs[ids[np.argsort(-match.before[ids], kind="stable")][:HUBS]] = True
    return hubs


def _share(part: Flags, whole: Flags) -> float:
    count = np.count_nonzero(whole)
    return float(np.count_nonzero(part & whole) / count) if count else 0.0


def _share_new(present: Flags, known: Ids) -> float:
    old = np.zeros(max(len(present), int(known.max(initial=-1)) + 1), dtype=np.bool_)
    old[known] = True
    return _share(~old[: len(present)], present)
