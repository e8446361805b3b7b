"""The truth file of a shipped world: what was planted, on which night, and what it did."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import date, timedelta
from typing import Any

import numpy as np

from islands.events import Planted
from islands.lively import Story
from islands.scoring import MATERIAL, spectral_radius
from islands.series import Effect, Series
from islands.world import Ids, Keys, contains


def day(first: date, night: int) -> str:
    """The date of a night, counted from 0 = ``first``."""
    return (first + timedelta(days=night)).isoformat()


def truth(
    series: Series,
    *,
    network: str,
    first: date,
    shipped: Sequence[int],
    faults: Sequence[dict[str, Any]] = (),
    stories: Sequence[Story] = (),
) -> dict[str, Any]:
    """Everything planted, and the figures of the nights. ``shipped`` are the nights that have a file."""
    busy = {planted.night for planted in series.planted} | {fault["number"] for fault in faults}
    return {
        "network": network,
        "alpha_katz": round(series.alpha, 9),
        "note": "places and effects are those of the true links, before any crawl noise; octaves compare the same "
        "night without the event and with it; place 0 = not in the network; an alert is due on "
        "its night or at most `within` nights later (drift: counted from `material_from`, its first night of 1.5x)",
        "events": [_event(series, planted, first) for planted in series.planted],
        "faults": [{"night": day(first, fault["number"]), **_without_number(fault)} for fault in faults],
        "quiet_nights": [day(first, night) for night in shipped if night not in busy],
        "natural_stories": _stories(series, stories, first),
        "nights": _nights(series, first, shipped),
    }


def _without_number(fault: dict[str, Any]) -> dict[str, Any]:
    return {key: value for key, value in fault.items() if key != "number"}


def _event(series: Series, planted: Planted, first: date) -> dict[str, Any]:
    told = [effect for effect in series.effects if effect.planted is planted]
    entry: dict[str, Any] = {
        "event": planted.event,
        "expected": planted.expected,
        "direction": planted.direction,
        "night": day(first, planted.night),
        "within": planted.within,
        "nodes": _names(series, planted.nodes),
        "k": len(planted.sources),
        "sources": _names(series, planted.sources),
        "effect": [_effect(series, effect) for effect in told if effect.night == planted.night],
        "added": _pairs(series, planted.added),
        "removed": _pairs(series, planted.removed),
    }
    if planted.note:
        entry["note"] = planted.note
    if planted.expected == "drift":
        entry |= _drip(series, planted, told, first)
    if planted.event == "dense ring":
        now = series.shots[planted.night].keys
        for label, keys in (("lambda_without", now[~contains(planted.added, now)]), ("lambda_with", now)):
            entry[label] = round(spectral_radius(keys, series.world.capacity), 4)
    return entry


def _drip(series: Series, planted: Planted, told: Sequence[Effect], first: date) -> dict[str, Any]:
    """How the effect grows, and the first night it is material in either score."""
    aimed = planted.added[planted.added % series.world.capacity == planted.nodes[0]]
    nights = []
    for night in sorted({effect.night for effect in told}):
        so_far = int(contains(series.shots[night].keys, aimed).sum())
        places = {e.score: [e.place_without, e.place_with, e.octaves] for e in told if e.night == night}
        nights.append({"night": day(first, night), "sources_so_far": so_far, **places})
    material = [e.night for e in told if e.octaves is not None and abs(e.octaves) >= MATERIAL]
    return {"material_from": day(first, min(material)) if material else None, "course": nights}


def _effect(series: Series, effect: Effect) -> dict[str, Any]:
    return {
        "node": series.world.names[effect.node],
        "score": effect.score,
        "place_before": effect.place_before,
        "place_without": effect.place_without,
        "place_with": effect.place_with,
        "octaves": effect.octaves,
        "value_ratio": round(effect.value_with / effect.value_without, 4),
    }


def _stories(series: Series, stories: Sequence[Story], first: date) -> list[dict[str, Any]]:
    """Natural bursts of five links or more on one night: true news that nobody planted."""
    bursts = [
        {"night": day(first, night), "node": series.world.names[story.target], "links": count}
        for story in stories
        for night, count in story.links.items()
        if count >= 5
    ]
    return sorted(bursts, key=lambda burst: (burst["night"], burst["node"]))


def _nights(series: Series, first: date, shipped: Sequence[int]) -> list[dict[str, Any]]:
    """Per night: links that exist, links in the file, how many came and went, lambda of the true links."""
    rows = []
    for night, shot in enumerate(series.shots):
        before = series.shots[max(0, night - 1)].keys
        rows.append(
            {
                "night": day(first, night),
                "links": len(shot.keys),
                "links_in_file": int(shot.seen.rows.sum()) if night in shipped else 0,
                "born": int(np.sum(~contains(before, shot.keys))),
                "gone": int(np.sum(~contains(shot.keys, before))),
                "sources_unfetched": len(shot.seen.unfetched),
                "sources_cut": len(shot.seen.cut),
                "lambda": round(spectral_radius(shot.keys, series.world.capacity, shot.weight), 4),
            }
        )
    return rows


def _names(series: Series, nodes: Ids) -> list[str]:
    return [series.world.names[node] for node in nodes]


def _pairs(series: Series, keys: Keys) -> list[list[str]]:
    names, capacity = series.world.names, series.world.capacity
    return [[names[key // capacity], names[key % capacity]] for key in keys]
