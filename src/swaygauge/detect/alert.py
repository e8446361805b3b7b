"""Making one alert: its key, the score it is told under, and the facts that every alert about a node carries."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from datetime import date
from typing import Any

import numpy as np

from swaygauge.detect.inputs import NightInputs
from swaygauge.detect.picture import Picture
from swaygauge.detect.view import ScoreView
from swaygauge.records import Alert


def alert_key(network: str, night: date, kind: str, score: str, node: int) -> str:
    """Twenty hex digits that name an alert: the same network, night, kind, score and node give the same key."""
    parts = json.dumps([network, night.isoformat(), kind, score, node], ensure_ascii=False)
    return hashlib.sha256(parts.encode("utf-8", "surrogatepass")).hexdigest()[:20]


def network_alert(inputs: NightInputs, kind: str, *, size: float, direction: str = "", **facts: Any) -> Alert:
    """An alert about the network as a whole."""
    return Alert(
        key=alert_key(inputs.network, inputs.night, kind, "", -1),
        night=inputs.night,
        kind=kind,
        node=-1,
        score="",
        direction=direction,
        rank_before=0,
        rank_now=0,
        size=size,
        facts=_night_facts(inputs) | facts,
    )


def node_alert(
    picture: Picture, kind: str, node: int, score: str, *, direction: str, size: float, **facts: Any
) -> Alert:
    """An alert about one node, told under one score; the facts show all scores."""
    view = picture.views[score]
    return Alert(
        key=alert_key(picture.inputs.network, picture.inputs.night, kind, score, node),
        night=picture.inputs.night,
        kind=kind,
        node=node,
        score=score,
        direction=direction,
        rank_before=int(view.rank_before[node]),
        rank_now=int(view.rank_now[node]),
        size=size,
        facts=_night_facts(picture.inputs) | {"provisional": picture.provisional} | _node_facts(picture, node) | facts,
    )


def largest_move(views: Mapping[str, ScoreView], node: int, *, direction: float = 0.0) -> tuple[str, float]:
    """The score under which a node moved most (in one direction, if given), and its octaves; ("", 0) if none."""
    best, most = "", 0.0
    for name, view in views.items():
        octaves = float(view.octaves[node])
        if np.isfinite(octaves) and octaves * direction >= 0.0 and abs(octaves) > abs(most):
            best, most = name, octaves
    return best, most


def best_place(views: Mapping[str, ScoreView], node: int, *, now: bool) -> tuple[str, int]:
    """The score under which a node stands (or stood) best, and its rank there; ("", 0) when it stands nowhere."""
    places = [(int((view.rank_now if now else view.rank_before)[node]), name) for name, view in views.items()]
    rank, name = min((place for place in places if place[0] > 0), default=(0, ""))
    return name, rank


def _night_facts(inputs: NightInputs) -> dict[str, Any]:
    return {
        "previous": inputs.previous.isoformat() if inputs.previous else None,
        "gap_nights": inputs.gap_nights,
        "degraded": inputs.verdict.outcome == "repair",
        "rescored": inputs.rescored,
    }


def _node_facts(picture: Picture, node: int) -> dict[str, Any]:
    links = picture.links
    return {
        "endorsements_before": int(picture.in_degree_before[node]),
        "new_links": int(links.new[node]),
        "expected_new": float(picture.gains.mean[node]),
        "lost_links": int(links.lost[node]),
        "expected_lost": float(picture.losses.mean[node]),
        "returned_links": int(links.returned[node]),
        "expired_links": int(links.expired[node]),
        "scores": {name: _standing(view, node) for name, view in picture.views.items()},
    }


def _standing(view: ScoreView, node: int) -> dict[str, Any]:
    return {
        "rank_before": int(view.rank_before[node]),
        "rank_now": int(view.rank_now[node]),
        "value_before": _number(view.value_before[node]),
        "value_now": _number(view.value_now[node]),
    }


def _number(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
