"""surge: a node moved, and its new (or lost) endorsements are more than history and standing explain."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np

from swaygauge.detect.alert import largest_move, node_alert
from swaygauge.detect.fdr import benjamini_hochberg
from swaygauge.detect.guard import choose_tail
from swaygauge.detect.picture import Picture
from swaygauge.records import Alert, Ints

LEAST_P: Final = 1e-300  # sizes stay finite


def find_surges(picture: Picture, earlier: Sequence[Alert]) -> list[Alert]:
    """Benjamini-Hochberg over all present nodes first; then the practical size: a watched node's rank ratio."""
    if picture.quiet or picture.new_baseline or picture.first:
        return []
    surprise, options = picture.surprise, picture.thresholds.surge
    p = surprise.p[choose_tail(picture.state.guard, picture.thresholds.tail_guard)]
    rejected = benjamini_hochberg(p, q=options.q, tests=int(picture.present.sum()))
    alerts = []
    for at in np.flatnonzero(rejected):
        node, rising = int(surprise.nodes[at]), bool(surprise.rising[at])
        views = {name: view for name, view in picture.views.items() if view.watched[node]}
        score, octaves = largest_move(views, node, direction=1.0 if rising else -1.0)
        if abs(octaves) >= np.log2(options.ratio):
            direction = "rose" if rising else "fell"
            size = -float(np.log10(max(p[at], LEAST_P)))
            alerts.append(node_alert(picture, "surge", node, score, direction=direction, size=size, octaves=octaves))
    return alerts


def count_unreported(picture: Picture, alerts: Sequence[Alert]) -> Ints:
    """(tails,) how many present nodes are surprising at the guard's level under each tail and were not reported."""
    surprise = picture.surprise
    reported = [alert.node for alert in alerts if alert.kind == "surge"]
    quiet = ~np.isin(surprise.nodes, reported)
    surprising: Ints = np.sum(surprise.p[:, quiet] <= picture.thresholds.tail_guard.level, axis=1, dtype=np.int64)
    return surprising
