"""Alerts about the network as a whole: the snapshot, the calendar, lambda, and who was merely displaced."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import timedelta
from typing import Any

import numpy as np

from swaygauge.detect.alert import network_alert
from swaygauge.detect.inputs import NightInputs, missing_nights
from swaygauge.detect.picture import Picture
from swaygauge.detect.ring import is_lambda_jump
from swaygauge.detect.swing import large_moves, moved_itself
from swaygauge.detect.thresholds import Thresholds
from swaygauge.detect.view import ScoreView
from swaygauge.records import Alert


def find_held(inputs: NightInputs, thresholds: Thresholds) -> list[Alert]:
    """The snapshot was held: nothing was scored, and what is shown is an earlier night."""
    if inputs.verdict.outcome != "hold":
        return []
    return [network_alert(inputs, "held", size=1.0, reasons=list(inputs.verdict.reasons))]


def find_overdue(inputs: NightInputs, thresholds: Thresholds) -> list[Alert]:
    """Expected nights before this one brought no snapshot at all."""
    last = inputs.last_seen or inputs.previous
    missing = missing_nights(last, inputs.night, inputs.cadence_days) if last else 0
    if last is None or missing == 0:
        return []
    step = timedelta(days=inputs.cadence_days)
    first, final = (last + step).isoformat(), (last + missing * step).isoformat()
    return [network_alert(inputs, "overdue", size=float(missing), nights=missing, first=first, last=final)]


def find_degraded(inputs: NightInputs, thresholds: Thresholds) -> list[Alert]:
    """The snapshot was scored after carrying what was missing."""
    upkeep = inputs.upkeep
    if inputs.verdict.outcome != "repair":
        return []
    facts: dict[str, Any] = {"reasons": list(inputs.verdict.reasons), "capped": inputs.verdict.capped}
    if upkeep is not None:
        facts |= {"carried_links": upkeep.carried_links, "carried_sources": upkeep.carried_sources}
    return [network_alert(inputs, "degraded", size=1.0, **facts)]


def find_coverage_step(inputs: NightInputs, thresholds: Thresholds) -> list[Alert]:
    """What is covered changed: a rise in coverage, a new baseline, or many links leaving or coming back at once."""
    upkeep = inputs.upkeep
    if inputs.verdict.rebaselined:
        what = "rebaselined"
    elif inputs.verdict.coverage_step:
        what = "rise"
    elif upkeep is not None and upkeep.coverage_step:
        what = "expired" if upkeep.expired_links >= upkeep.returned_links else "returned"
    else:
        return []
    facts: dict[str, Any] = {"what": what}
    if upkeep is not None:
        counted = ("new_links", "returned_links", "expired_links", "coverage_links")
        facts |= {name: getattr(upkeep, name) for name in counted}
    return [network_alert(inputs, "coverage_step", size=1.0, **facts)]


def find_lambda_jump(inputs: NightInputs, thresholds: Thresholds) -> list[Alert]:
    """The spectral radius is proven to have risen; names the nodes that carry it where that was worked out."""
    ring, before, now = inputs.ring, inputs.bounds_before, inputs.bounds_now
    jump = thresholds.network.lambda_jump
    if before is None or now is None or not is_lambda_jump(before, now, jump=jump):
        return []
    facts = {"before": before.upper, "now": now.lower}
    if ring is not None:
        facts |= {
            "nodes": ring.nodes.tolist(),
            "links": int(ring.rows.sum()),
            "without": ring.lambda_without,
            "enough": ring.enough,
        }
    size = now.lower / before.upper - 1.0 if before.upper > 0.0 else now.lower
    return [network_alert(inputs, "lambda_jump", size=size, direction="rose", **facts)]


def find_displacement(picture: Picture, earlier: Sequence[Alert]) -> list[Alert]:
    """Many ranks moved although the nodes' own scores did not: others came in, or dropped out, above them. One line."""
    if picture.new_baseline or picture.first:
        return []
    options = picture.thresholds.swing
    ratio = options.early_ratio if picture.quiet else options.ratio
    displaced = {
        name: large_moves(picture, view, ratio) & ~moved_itself(picture, view) for name, view in picture.views.items()
    }
    name = max(displaced, key=lambda score: (np.count_nonzero(displaced[score]), score), default=None)
    if name is None or np.count_nonzero(displaced[name]) < picture.thresholds.network.displaced_nodes:
        return []
    nodes, view = displaced[name], picture.views[name]
    deepest = int(max(view.rank_before[nodes].max(), view.rank_now[nodes].max()))
    fell = int(np.count_nonzero(view.octaves[nodes] < 0))
    count = int(np.count_nonzero(nodes))
    facts = {"score": name, "displaced": count, "fell": fell, "deepest": deepest} | _through(view, deepest)
    direction = "fell" if 2 * fell >= count else "rose"
    return [network_alert(picture.inputs, "displacement", size=float(count), direction=direction, **facts)]


def _through(view: ScoreView, place: int) -> dict[str, int]:
    """How many nodes came in above a place and how many dropped out of it, and how many of these are new or gone."""
    was = (view.rank_before > 0) & (view.rank_before <= place)
    is_now = (view.rank_now > 0) & (view.rank_now <= place)
    entered, left = is_now & ~was, was & ~is_now
    return {
        "entered": int(entered.sum()),
        "arrived": int((entered & (view.rank_before == 0)).sum()),
        "dropped": int(left.sum()),
        "departed": int((left & (view.rank_now == 0)).sum()),
    }
