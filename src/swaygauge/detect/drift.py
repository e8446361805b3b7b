"""drift: a node moves the same way night after night, no night of it remarkable."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

import numpy as np

from swaygauge.detect.alert import node_alert
from swaygauge.detect.picture import Picture
from swaygauge.detect.spread import SpreadHistory
from swaygauge.detect.state import DriftMemory
from swaygauge.detect.sums import REPORTED, SIGN, DriftAlarms, choose_limit
from swaygauge.moves import depth_band
from swaygauge.records import MOVED, Alert, Flags, Ints


def find_drifts(picture: Picture, earlier: Sequence[Alert]) -> list[Alert]:
    """One alert per node and direction whose sum crossed the limit in use or a larger one, under the score it moved
    most.

    Larger ones too: a sum that crossed the limit now in use before that was in use has started again, unheard. Nodes
    that another alert of tonight already tells of are left out, and those that drift told of within the cooldown.
    """
    memory, options = picture.step.memory, picture.thresholds.drift
    alerts = []
    for direction, place, limit in _reported(picture, earlier):
        at = (direction, limit, place)
        crossed = [name for name, flags in picture.step.alarm.items() if flags[at]]
        score = max(crossed, key=lambda name: (abs(memory.sums[name].octaves[at]), name))
        sums = memory.sums[score]
        octaves, nights = float(sums.octaves[at]), int(sums.nights[at])
        window = min(nights, options.window)
        alert = node_alert(
            picture,
            "drift",
            int(memory.ids[place]),
            score,
            direction="rose" if octaves > 0 else "fell",
            size=abs(octaves),
            octaves=octaves,
            nights=nights,
            window=window,
            window_new=int(memory.new[-window:, place].sum()),
            window_expected=float(memory.due[-window:, place].sum()),
            window_lost=int(memory.lost[-window:, place].sum()),
            limit=options.limits[limit],
        )
        alerts.append(replace(alert, rank_before=int(sums.start_rank[at])))
    return alerts


def _reported(picture: Picture, alerts: Iterable[Alert]) -> list[tuple[int, int, int]]:
    """(direction, place of the node, smallest limit crossed) of every drift to tell of tonight."""
    memory, options, number = picture.step.memory, picture.thresholds.drift, picture.inputs.history
    used = _limit_in_use(picture)
    crossed = np.zeros((len(SIGN), len(options.limits), len(memory.ids)), np.bool_)
    for flags in picture.step.alarm.values():
        crossed |= flags
    crossed &= ~np.isin(memory.ids, _told(alerts))
    found = []
    for direction in range(len(SIGN)):
        rested = picture.state.alarms.rested(number, memory.ids, direction, REPORTED, cooldown=options.cooldown)
        heard = crossed[direction, used:]
        smallest = used + np.argmax(heard, axis=0)
        places = np.flatnonzero(heard.any(axis=0) & rested).tolist()
        found += [(direction, place, int(smallest[place])) for place in places]
    return found


def first_alarms(picture: Picture, alerts: Iterable[Alert]) -> Flags:
    """(d, h, k) alarms under any score that count: not told otherwise tonight, and none within the cooldown before."""
    memory, options = picture.step.memory, picture.thresholds.drift
    first = np.zeros((len(SIGN), len(options.limits), len(memory.ids)), np.bool_)
    for flags in picture.step.alarm.values():
        first |= flags
    first &= ~np.isin(memory.ids, _told(alerts))
    for direction in range(len(SIGN)):
        for limit in range(len(options.limits)):
            first[direction, limit] &= picture.state.alarms.rested(
                picture.inputs.history, memory.ids, direction, limit, cooldown=options.cooldown
            )
    return first


def settle_drift(picture: Picture, alerts: Iterable[Alert]) -> tuple[DriftMemory, DriftAlarms]:
    """What is remembered: alarmed sums, and all of nodes told of otherwise, start again; first alarms are counted."""
    memory, options = picture.step.memory, picture.thresholds.drift
    if picture.new_baseline:
        return DriftMemory.empty(options.window, memory.first_night), picture.state.alarms
    alerts = tuple(alerts)
    told = np.isin(memory.ids, _told(alerts))
    sums = {
        name: memory.sums[name].reset(flags | told, picture.views[name].rank_now[memory.ids])
        for name, flags in picture.step.alarm.items()
    }
    reported = np.array([(way, REPORTED, place) for way, place, _ in _reported(picture, alerts)], np.int64)
    rows = np.vstack((np.argwhere(first_alarms(picture, alerts)), reported.reshape(-1, 3)))
    direction, limit, place = rows.T
    alarms = picture.state.alarms.after(
        picture.inputs.history,
        memory.ids[place].astype(np.int64),
        direction.astype(np.int64),
        limit.astype(np.int64),
        window=max(options.budget_nights, options.cooldown),
    )
    return replace(memory, sums=sums), alarms


def remember_spread(picture: Picture) -> dict[str, SpreadHistory]:
    """The usual sizes of change with tonight's added; a night with a new baseline says nothing about them."""
    spread = dict(picture.state.spread)
    for name, moves in picture.inputs.moves.items():
        moved = moves.status == MOVED
        if picture.new_baseline or not moved.any():
            continue
        spread[name] = spread.get(name, SpreadHistory.empty()).after(
            picture.inputs.history,
            depth_band(moves.rank_before[moved]),
            moves.deviation[moved],
            window=picture.thresholds.drift.window,
        )
    return spread


def _told(alerts: Iterable[Alert]) -> Ints:
    """The nodes that alerts of other kinds tell of."""
    nodes = [alert.node for alert in alerts if alert.kind != "drift" and alert.node >= 0]
    return np.array(sorted(set(nodes)), np.int64)


def _limit_in_use(picture: Picture) -> int:
    options, number, began = picture.thresholds.drift, picture.inputs.history, picture.state.drift.first_night
    return choose_limit(
        picture.state.alarms,
        number,
        number - began if began >= 0 else 0,
        limits=len(options.limits),
        first=options.limits.index(options.first_limit),
        budget=options.budget,
        window=options.budget_nights,
    )
