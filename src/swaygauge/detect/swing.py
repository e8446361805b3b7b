"""swing: a large move of rank and of the node's own score, by whatever cause. Also who was merely displaced.

How far a single link moves a node differs between networks: where endorsements are few, or chains of them long, every
night many ranks double. The ratio asked for is therefore the smallest of a ladder that keeps to a budget.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from swaygauge.detect.alert import largest_move, node_alert
from swaygauge.detect.picture import Picture
from swaygauge.detect.swings import choose_ratio
from swaygauge.detect.view import ScoreView
from swaygauge.records import Alert, Flags, Ints


def find_swings(picture: Picture, earlier: Sequence[Alert]) -> list[Alert]:
    """Nodes already told of tonight as a surge are left out: that says more about them."""
    if picture.new_baseline:
        return []
    ratio = ratio_in_use(picture)
    alerts = []
    for node, (score, octaves) in _moved_far(picture, earlier).items():
        if abs(octaves) >= np.log2(ratio):
            direction = "rose" if octaves > 0 else "fell"
            facts = {"octaves": octaves, "ratio": ratio}
            alerts.append(node_alert(picture, "swing", node, score, direction=direction, size=abs(octaves), **facts))
    return alerts


def ratio_in_use(picture: Picture) -> float:
    """The least ratio of ranks tonight; larger while the history is short, or where nights were full of swings."""
    options = picture.thresholds.swing
    chosen = choose_ratio(picture.state.swings, options)
    return max(chosen, options.early_ratio) if picture.quiet else chosen


def count_swings(picture: Picture, alerts: Sequence[Alert]) -> Ints:
    """(ratios,) how many swings there would be tonight under each ratio of the ladder."""
    options = picture.thresholds.swing
    sizes = np.array([abs(octaves) for _, octaves in _moved_far(picture, alerts).values()])
    steps = np.log2((options.ratio, *options.raised))
    counted: Ints = np.sum(sizes[:, None] >= steps, axis=0, dtype=np.int64)
    return counted


def large_moves(picture: Picture, view: ScoreView, ratio: float) -> Flags:
    """(nodes,) watched nodes whose rank ratio is large."""
    with np.errstate(invalid="ignore"):  # NaN where the node was absent on a night: never large
        large: Flags = view.watched & (np.abs(view.octaves) >= np.log2(ratio))
    return large


def moved_itself(picture: Picture, view: ScoreView) -> Flags:
    """(nodes,) whether the node's own score moved the way its rank did, so that it was not just displaced by others."""
    with np.errstate(invalid="ignore"):
        own: Flags = view.deviation * np.sign(view.octaves) >= picture.thresholds.swing.min_value_change
    return own


def _moved_far(picture: Picture, alerts: Sequence[Alert]) -> dict[int, tuple[str, float]]:
    """Every node that moved by the smallest ratio and is no surge: the score it moved most under, and its octaves."""
    ratio = picture.thresholds.swing.ratio
    moved = {
        name: large_moves(picture, view, ratio) & moved_itself(picture, view) for name, view in picture.views.items()
    }
    told = {alert.node for alert in alerts if alert.kind == "surge"}
    nodes = np.flatnonzero(np.any(list(moved.values()), axis=0)) if moved else np.zeros(0, np.int64)
    far = {}
    for node in nodes.tolist():
        if node not in told:
            views = {name: view for name, view in picture.views.items() if moved[name][node]}
            far[node] = largest_move(views, node)
    return far
