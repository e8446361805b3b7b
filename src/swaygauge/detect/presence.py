"""arrival and departure: nodes that come straight to a high place, or are gone from one."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from swaygauge.detect.alert import best_place, node_alert
from swaygauge.detect.picture import Picture
from swaygauge.records import Alert

RENAME_NIGHTS = 3  # a departure so many nights after its rename proposal is part of that, and no news


def find_arrivals(picture: Picture, earlier: Sequence[Alert]) -> list[Alert]:
    """Nodes absent the night before and now at ``arrival_rank`` or better under any score.

    A node that was there on some earlier night counts too and says so. New nodes of a rename proposal are left out.
    """
    if picture.new_baseline or picture.first:
        return []
    line = picture.thresholds.presence.arrival_rank
    told = {alert.node for alert in earlier if alert.kind == "rename"}
    alerts = []
    for node in _within(picture, line, now=True) - told:
        score, rank = best_place(picture.views, node, now=True)
        returned = bool(picture.state.seen[node])
        size = float(np.log2(line / rank))
        alerts.append(node_alert(picture, "arrival", node, score, direction="came", size=size, returned=returned))
    return alerts


def find_departures(picture: Picture, earlier: Sequence[Alert]) -> list[Alert]:
    """Nodes there the night before at ``departure_rank`` or better under any score, and now without any link.

    ``judged`` tells a node that took its links and lost its endorsements on one night from one that faded out of the
    snapshots. Old nodes of a rename proposal, tonight's or a recent one, are left out.
    """
    if picture.new_baseline or picture.first:
        return []
    line = picture.thresholds.presence.departure_rank
    told = {alert.facts["old"] for alert in earlier if alert.kind == "rename"}
    told |= set(picture.state.renamed[picture.state.renamed_on > picture.inputs.history - RENAME_NIGHTS].tolist())
    judged = set(picture.inputs.upkeep.departed.tolist()) if picture.inputs.upkeep else set()
    alerts = []
    for node in _within(picture, line, now=False) - told:
        score, rank = best_place(picture.views, node, now=False)
        size = float(np.log2(line / rank))
        alerts.append(node_alert(picture, "departure", node, score, direction="left", size=size, judged=node in judged))
    return alerts


def _within(picture: Picture, line: int, *, now: bool) -> set[int]:
    """Nodes present on only one night (tonight if ``now``) and there at this place or better under some score."""
    nodes: set[int] = set()
    for view in picture.views.values():
        here, there = (view.rank_now, view.rank_before) if now else (view.rank_before, view.rank_now)
        nodes |= set(np.flatnonzero((here > 0) & (here <= line) & (there == 0)).tolist())
    return nodes
