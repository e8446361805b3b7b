"""rename: a node comes on the night another leaves, and mostly the same nodes endorse it. Proposes an alias line."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from scipy import sparse

from swaygauge.detect.alert import best_place, node_alert
from swaygauge.detect.picture import Picture
from swaygauge.records import EXPIRED, LOST, NEW, RETURNED, WAITING, Alert, Flags, Ids, Ints

LEAVING_SHARE: Final = 0.8  # a node is leaving when so much of its endorsement is gone, or missing for the first night


def find_renames(picture: Picture, earlier: Sequence[Alert]) -> list[Alert]:
    """Pairs of a leaving and a newly come node with enough endorsers in common, best overlap first, each node once.

    A link missing for one night still counts for the score, but here it already says that its endorser may have moved
    on: otherwise a renamed node would come one night before its old name is seen to leave.
    """
    if picture.new_baseline or picture.first:
        return []
    presence = picture.thresholds.presence
    new, old, shared = _shared_endorsers(picture, _come(picture), _leaving(picture))
    in_degree_now = np.bincount(picture.book.target[picture.book.in_effect], minlength=picture.inputs.nodes)
    overlap = shared / (in_degree_now[new] + picture.in_degree_before[old] - shared)
    near = np.any([view.watched[new] | view.watched[old] for view in picture.views.values()], axis=0)
    good = (overlap >= presence.rename_overlap) & (shared >= presence.rename_shared) & near
    alerts: list[Alert] = []
    taken: set[int] = set()
    for at in np.lexsort((old, new, -overlap)):
        pair = {int(new[at]), int(old[at])}
        if not good[at] or pair & taken:
            continue
        taken |= pair
        old_score, old_rank = best_place(picture.views, int(old[at]), now=False)
        score, _ = best_place(picture.views, int(new[at]), now=True)
        facts = {"old": int(old[at]), "old_rank": old_rank, "old_score": old_score, "shared": int(shared[at])}
        all_endorsers = int(in_degree_now[new[at]] + picture.in_degree_before[old[at]] - shared[at])
        facts |= {"endorsers": all_endorsers}
        alerts.append(
            node_alert(picture, "rename", int(new[at]), score, direction="came", size=float(overlap[at]), **facts)
        )
    return alerts


def _come(picture: Picture) -> Flags:
    """(nodes,) never seen before, here tonight."""
    come: Flags = picture.present & ~picture.state.seen
    return come


def _leaving(picture: Picture) -> Flags:
    """(nodes,) endorsed the night before, and nearly all of that lost tonight or missing for the first night."""
    waiting = (picture.book.state == WAITING) & (picture.book.absent == 1)
    gone = picture.links.lost + np.bincount(picture.book.target[waiting], minlength=picture.inputs.nodes)
    leaving: Flags = (picture.in_degree_before > 0) & (gone >= LEAVING_SHARE * picture.in_degree_before)
    return leaving


def _shared_endorsers(picture: Picture, come: Flags, leaving: Flags) -> tuple[Ids, Ids, Ints]:
    """Pairs (new node, old node, endorsers in common) with at least one in common."""
    book, changes = picture.book, picture.changes
    rows = book.in_effect & come[book.target]
    source, target = book.source[rows], book.target[rows]
    # endorsers of the old node last night: those that are gone, and those that remain
    gone = np.isin(changes.kind, (LOST, EXPIRED)) & leaving[changes.target]
    stays = book.in_effect & leaving[book.target]
    since = np.isin(changes.kind, (NEW, RETURNED)) & leaving[changes.target]
    late = _pairs(book.source[stays], book.target[stays])
    kept = ~np.isin(late, _pairs(changes.source[since], changes.target[since]))
    old_source = np.concatenate((changes.source[gone], book.source[stays][kept]))
    old_target = np.concatenate((changes.target[gone], book.target[stays][kept]))
    nodes = picture.inputs.nodes
    endorses_new = sparse.csr_array((np.ones(len(source), np.int64), (target, source)), shape=(nodes, nodes))
    endorses_old = sparse.csr_array(
        (np.ones(len(old_source), np.int64), (old_source, old_target)), shape=(nodes, nodes)
    )
    common = (endorses_new @ endorses_old).tocoo()
    return common.row.astype(np.int32), common.col.astype(np.int32), common.data.astype(np.int64)


def _pairs(source: Ids, target: Ids) -> Ints:
    return (target.astype(np.int64) << 32) | source
