"""One night judged: alerts, and the state that the next night starts from."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from swaygauge.detect.counts import remember_counts
from swaygauge.detect.drift import remember_spread, settle_drift
from swaygauge.detect.inputs import NightInputs
from swaygauge.detect.kinds import KINDS, order_alerts
from swaygauge.detect.picture import Picture, take_picture
from swaygauge.detect.presence import RENAME_NIGHTS
from swaygauge.detect.state import DetectorState
from swaygauge.detect.surge import count_unreported
from swaygauge.detect.swing import count_swings
from swaygauge.detect.swings import after_night
from swaygauge.detect.thresholds import Thresholds
from swaygauge.records import Alert


def detect(
    inputs: NightInputs, state: DetectorState | None, thresholds: Thresholds
) -> tuple[tuple[Alert, ...], DetectorState]:
    """The alerts of one night in attention order, and the state after it.

    state: that of the last accepted night, None before the first. On a held night it comes back as it is. The result
    depends on nothing but the arguments: replaying the accepted nights gives the same bytes.

    Raises ValueError when a scored night comes without its book, changes or in-degrees.
    """
    state = DetectorState.empty(inputs.nodes, thresholds) if state is None else state
    alerts: list[Alert] = []
    for kind in KINDS.values():
        if kind.of_snapshot is not None and kind.name in thresholds.kinds:
            alerts += kind.of_snapshot(inputs, thresholds)
    if inputs.verdict.outcome == "hold":
        return order_alerts(alerts), state
    picture = take_picture(inputs, state.fitted(inputs.nodes, thresholds), thresholds)
    for kind in KINDS.values():
        if kind.of_moves is not None and kind.name in thresholds.kinds:
            alerts += kind.of_moves(picture, tuple(alerts))
    return order_alerts(alerts), _next_state(picture, alerts)


def _next_state(picture: Picture, alerts: list[Alert]) -> DetectorState:
    """The state after a scored night. A change of coverage says nothing about attention, so counts wait then."""
    state, surge, number = picture.state, picture.thresholds.surge, picture.inputs.history
    drift, alarms = settle_drift(picture, alerts)
    if picture.new_baseline or picture.first:
        return replace(state, seen=state.seen | picture.present, drift=drift, alarms=alarms)
    guard = state.guard
    if not picture.quiet:
        unreported = count_unreported(picture, alerts)
        guard = guard.after(int(picture.present.sum()), unreported, nights=picture.thresholds.tail_guard.nights)
    memory = {"memory": surge.memory, "dispersion_memory": surge.dispersion_memory}
    recent = state.renamed_on > number - RENAME_NIGHTS
    old = [alert.facts["old"] for alert in alerts if alert.kind == "rename"]
    swings = after_night(state.swings, count_swings(picture, alerts), nights=picture.thresholds.swing.budget_nights)
    return replace(
        state,
        swings=swings,
        seen=state.seen | picture.present,
        gains=remember_counts(state.gains, picture.gains, picture.present, **memory),
        losses=remember_counts(state.losses, picture.losses, picture.present, **memory),
        guard=guard,
        spread=remember_spread(picture),
        drift=drift,
        alarms=alarms,
        renamed=np.append(state.renamed[recent], np.array(old, np.int32)),
        renamed_on=np.append(state.renamed_on[recent], np.full(len(old), number, np.int64)),
    )
