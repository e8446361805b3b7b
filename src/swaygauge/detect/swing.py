"""swing: a large move of rank and of the node's own score, by whatever cause. Also who was merely displaced."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from swaygauge.detect.alert import largest_move, node_alert
from swaygauge.detect.picture import Picture
from swaygauge.detect.view import ScoreView
from swaygauge.records import Alert, Flags


def find_swings(picture: Picture, earlier: Sequence[Alert]) -> list[Alert]:
    """Nodes already told of tonight as a surge are left out: that says more about them."""
    if picture.new_baseline:
        return []
    moved = {name: large_moves(picture, view) & moved_itself(picture, view) for name, view in picture.views.items()}
    told = {alert.node for alert in earlier if alert.kind == "surge"}
    alerts = []
    for node in np.flatnonzero(np.any(list(moved.values()), axis=0)) if moved else ():
        if int(node) in told:
            continue
        views = {name: view for name, view in picture.views.items() if moved[name][node]}
        score, octaves = largest_move(views, int(node))
        direction = "rose" if octaves > 0 else "fell"
        alerts.append(
            node_alert(picture, "swing", int(node), score, direction=direction, size=abs(octaves), octaves=octaves)
        )
    return alerts


def large_moves(picture: Picture, view: ScoreView) -> Flags:
    """(nodes,) watched nodes whose rank ratio is large; larger still is asked for while the history is short."""
    options = picture.thresholds.swing
    ratio = options.early_ratio if picture.quiet else options.ratio
    with np.errstate(invalid="ignore"):  # NaN where the node was absent on a night: never large
        large: Flags = view.watched & (np.abs(view.octaves) >= np.log2(ratio))
    return large


def moved_itself(picture: Picture, view: ScoreView) -> Flags:
    """(nodes,) whether the node's own score moved the way its rank did, so that it was not just displaced by others."""
    with np.errstate(invalid="ignore"):
        own: Flags = view.deviation * np.sign(view.octaves) >= picture.thresholds.swing.min_value_change
    return own
