"""Charts of the studies as Vega-Lite: a plain dictionary, drawn to SVG without a browser.

What colour says is always said by dash, symbol or words as well.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

from swaygauge.study.attenuation import Measured
from swaygauge.study.recommend import Recommendation
from swaygauge.study.resampling import Check
from swaygauge.study.steadiness import Noise

SCHEMA = "https://vega.github.io/schema/vega-lite/v5.json"  # names the grammar; nothing is fetched
INK, QUIET, GRID = "#22303c", "#5f6f7a", "#e3e6e3"
LOOK: dict[str, dict[str, Any]] = {
    "katz": {"color": "#1b5e7a", "dash": [1, 0], "shape": "circle"},
    "fairshare": {"color": "#a4541b", "dash": [6, 3], "shape": "square"},
}
WELL = 0.9  # share of resampled places inside a band, below which the band is marked as failing
LABELLED = 3  # widest bands that are named in the chart

PANELS = (
    ("moves", "How far the top moves on a quiet night", "octaves, mean"),
    ("price", "Price of a place in the top", "fresh endorsers"),
    ("overlap", "Likeness to the ranking in use now", "rank-biased overlap"),
    ("held", "Share of all value that the top holds", "share"),
)


def can_draw() -> bool:
    """Whether the library that draws is installed."""
    try:
        import vl_convert  # noqa: F401
    except ImportError:
        return False
    return True


def draw(spec: dict[str, Any]) -> str:
    """The chart as SVG. Needs vl-convert-python (see :func:`can_draw`)."""
    import vl_convert

    svg: str = vl_convert.vegalite_to_svg(spec, allowed_base_urls=[])
    return svg


def tune_chart(
    rows: Sequence[Measured], advice: Sequence[Recommendation], *, title: str, subtitle: str
) -> dict[str, Any]:
    """Four small panels over the share of 1/lambda: movement, price, likeness, concentration."""
    chosen = {each.score: each.share for each in advice}
    data = [
        {
            "score": row.setting.score,
            "share": round(row.setting.share, 6),
            "moves": row.quiet_octaves,
            "price": row.price,
            "overlap": row.overlap_present,
            "held": row.top_share,
            "present": row.setting.present,
            "recommended": _is_chosen(row, chosen),
        }
        for row in rows
        if not row.problem
    ]
    panels = [_panel(field, head, unit, data, with_legend=field == "moves") for field, head, unit in PANELS]
    words = [subtitle, "ring: in use now; diamond: recommended"]
    return _framed(title, words, {"concat": panels, "columns": 2, "spacing": 34})


def _is_chosen(row: Measured, chosen: dict[str, float | None]) -> bool:
    share = chosen.get(row.setting.score)
    return share is not None and abs(share - row.setting.share) < 1e-9


def _panel(field: str, head: str, unit: str, data: list[dict[str, Any]], *, with_legend: bool) -> dict[str, Any]:
    scores = list(LOOK)
    domain = {"domain": scores}
    legend = {"title": None, "orient": "top-left", "symbolStrokeWidth": 2} if with_legend else None
    colour = {
        "field": "score",
        "type": "nominal",
        "scale": domain | {"range": [LOOK[score]["color"] for score in scores]},
        "legend": legend,
    }
    dash = {
        "field": "score",
        "type": "nominal",
        "scale": domain | {"range": [LOOK[score]["dash"] for score in scores]},
        "legend": legend,
    }
    shape = {
        "field": "score",
        "type": "nominal",
        "scale": domain | {"range": [LOOK[score]["shape"] for score in scores]},
        "legend": legend,
    }
    there = [row for row in data if row[field] is not None]
    log = field == "price"
    x = {"field": "share", "type": "quantitative", "title": "share of 1/lambda", "scale": {"zero": False}}
    y = {
        "field": field,
        "type": "quantitative",
        "title": unit,
        "scale": _log_over(there, field) if log else {"zero": False},
    }
    return {
        "title": {"text": head, "anchor": "start", "fontSize": 12, "fontWeight": 600, "color": INK},
        "width": 300,
        "height": 170,
        "data": {"values": there},
        "encoding": {"x": x, "y": y},
        "layer": [
            {"mark": {"type": "line", "strokeWidth": 1.6}, "encoding": {"color": colour, "strokeDash": dash}},
            {
                "mark": {"type": "point", "filled": True, "size": 34, "opacity": 1},
                "encoding": {"color": colour, "shape": shape},
            },
            _mark("present", "circle"),
            _mark("recommended", "diamond"),
        ],
    }


def _mark(word: str, shape: str) -> dict[str, Any]:
    """A ring around the points that a word is true of; the subtitle says which ring is which."""
    return {
        "transform": [{"filter": f"datum.{word}"}],
        "mark": {
            "type": "point",
            "shape": shape,
            "filled": False,
            "size": 170 if shape == "circle" else 330,
            "strokeWidth": 1.4,
            "color": INK,
        },
    }


def _log_over(data: Sequence[dict[str, Any]], field: str) -> dict[str, Any]:
    """A logarithmic axis that ends where the data do."""
    values = [row[field] for row in data if row[field] > 0]
    if not values:
        return {"zero": False}
    return {"type": "log", "domain": [0.7 * min(values), 1.4 * max(values)], "nice": False}


def steadiness_chart(
    bands: Sequence[tuple[str, Noise, Check, Sequence[str]]], *, title: str, subtitle: str
) -> dict[str, Any]:
    """Per score, how far each node's band reaches above and below its place. bands: (score, noise, check, names)."""
    panels = [_band_panel(*band) for band in bands]
    body = {"hconcat": panels, "spacing": 34, "resolve": {"scale": {"color": "independent", "shape": "independent"}}}
    return _framed(title, subtitle, body)


def _band_panel(score: str, noise: Noise, check: Check, names: Sequence[str]) -> dict[str, Any]:
    good, poor = "band of places", f"fewer than {WELL:.0%} of resampled places in the band"
    data: list[dict[str, Any]] = [
        {
            "place": int(place),
            "up": math.log2(place / first),
            "down": math.log2(place / last),
            "held": good if inside >= WELL else poor,
        }
        for place, first, last, inside in zip(noise.rank, noise.first, noise.last, check.inside, strict=True)
    ]
    for row, name in zip(data, names, strict=True):
        row["name"] = name
        row["width"] = row["up"] - row["down"]
        row["end"] = row["up"] if row["up"] >= -row["down"] else row["down"]
    for row in sorted(data, key=lambda row: -row["width"])[LABELLED:]:
        row["name"] = ""
    legend = {"title": None, "orient": "bottom", "labelLimit": 400, "direction": "vertical"}
    symbols = {"domain": [good, poor], "range": [LOOK[score]["shape"], "cross"]}
    colours = {"domain": [good, poor], "range": [LOOK[score]["color"], INK]}
    x = {"field": "place", "type": "quantitative", "title": "place now", "scale": {"type": "log", "base": 2}}
    y = {"type": "quantitative", "title": "octaves above and below it (1: place number halved)"}
    return {
        "title": {"text": score, "anchor": "start", "fontSize": 12, "fontWeight": 600, "color": INK},
        "width": 360,
        "height": 280,
        "data": {"values": data},
        "encoding": {"x": x},
        "layer": [
            {
                "mark": {"type": "rule", "strokeWidth": 2, "opacity": 0.6, "color": LOOK[score]["color"]},
                "encoding": {"y": y | {"field": "up"}, "y2": {"field": "down"}},
            },
            {
                "mark": {"type": "point", "filled": True, "size": 22, "opacity": 1},
                "encoding": {
                    "y": {"datum": 0, "type": "quantitative"},
                    "shape": {"field": "held", "type": "nominal", "scale": symbols, "legend": legend},
                    "color": {"field": "held", "type": "nominal", "scale": colours, "legend": legend},
                },
            },
            {
                "transform": [{"filter": "datum.name != '' && datum.width > 0"}],
                "mark": {"type": "text", "align": "left", "dx": 5, "fontSize": 9, "color": INK, "limit": 170},
                "encoding": {"y": y | {"field": "end"}, "text": {"field": "name"}},
            },
        ],
    }


def _framed(title: str, subtitle: str | list[str], body: dict[str, Any]) -> dict[str, Any]:
    return {
        "$schema": SCHEMA,
        "background": "#fcfcfa",
        "padding": 18,
        "title": {
            "text": title,
            "subtitle": subtitle,
            "anchor": "start",
            "fontSize": 15,
            "subtitleFontSize": 11,
            "subtitleColor": QUIET,
            "color": INK,
            "offset": 14,
        },
        **body,
        "config": {
            "font": "sans-serif",
            "view": {"stroke": None},
            "axis": {
                "gridColor": GRID,
                "domainColor": QUIET,
                "tickColor": QUIET,
                "labelColor": INK,
                "titleColor": QUIET,
                "titleFontWeight": "normal",
            },
        },
    }
