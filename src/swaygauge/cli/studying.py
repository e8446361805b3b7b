"""Commands that study stored nights: they solve anew, print a table, and keep it with a chart beside the nights."""

from __future__ import annotations

import json
from datetime import date, datetime
from typing import TYPE_CHECKING, Annotated, Any

import typer

from swaygauge.cli.context import AsJson, Network, place_of, reader_of
from swaygauge.cli.output import complain, print_json, print_table, say
from swaygauge.config.place import Place
from swaygauge.visible import visible

if TYPE_CHECKING:
    from swaygauge.study.steady import Steadiness, Steady
    from swaygauge.study.tune import Tuned

DAY = ["%Y-%m-%d"]
Night = Annotated[
    datetime | None, typer.Option("--night", formats=DAY, help="The night; default: the newest scored one.")
]
Top = Annotated[int | None, typer.Option("--top", min=1, help="Places studied; default: scores.top.")]


LEGEND = (
    "like below, like now: rank-biased overlap with the next smaller share and with the alpha in use, 1 = the same.",
    "octaves: mean move of a node in the top on a quiet night, and its standard error; moved: how many of them changed",
    "their place by a quarter or more. price: fresh one-link endorsers that lift a node from about place {far} to",
    "place {top}: the median of {buyers} nodes, each solved again with so many and with one fewer; - = no number does.",
    "error: largest proven error of a value, relative to it.",
)


def _day(value: datetime | None) -> date | None:
    return value.date() if value else None


def _number(value: float | None, form: str) -> str:
    return "-" if value is None else format(value, form)


def tune(
    network: Network,
    night: Night = None,
    top: Top = None,
    quiet: Annotated[int, typer.Option(min=1, max=366, help="How many quiet nights to measure movement on.")] = 10,
    as_json: AsJson = False,
) -> None:
    """Which share of 1/lambda suits the network: change, movement, concentration and price over a grid of shares."""
    place = place_of(network)
    from swaygauge.night.work import work_for
    from swaygauge.study.picture import tune_chart
    from swaygauge.study.tune import tune as study

    told = study(work_for(place.file), _day(night), top=top, quiet=quiet)
    subtitle = (
        f"first {told.top} places on {told.night}; movement on {len(told.quiet)} quiet nights; "
        "fairshare's lambda is 1, its share is its alpha"
    )
    chart = tune_chart(told.rows, told.advice, title=f"{place.title}: what the share does", subtitle=subtitle)
    kept = _keep(place, told.night, "tune", told.as_json(), chart)
    if as_json:
        print_json(told.as_json())
        return
    _say_tuned(place, told)
    _say_kept(kept)


def _say_tuned(place: Place, told: Tuned) -> None:
    from swaygauge.study.attenuation import BUYERS, FROM_FAR

    say(f"{place.title}: shares of 1/lambda, first {told.top} places on {told.night}")
    if told.quiet:
        say(f"Movement on {len(told.quiet)} quiet nights, {told.quiet[0][1]} to {told.quiet[-1][1]}.")
    else:
        say("There is no quiet night with a quiet one before it: movement is not known.")
    if told.bounds.upper:
        say(
            f"lambda is at most {told.bounds.upper:.6g} on these nights; within the last {told.rise_nights} nights it "
            f"rose by {told.rise - 1:.1%} at most."
        )
    else:
        say("The network has no cycle: lambda is 0, every alpha is legal, and katz's shares are alphas.")
    say()
    names = [(row.setting.score, f"{row.setting.share:.3f}" + " now" * row.setting.present) for row in told.rows]
    print_table(
        ("score", "share", "like below", "like now", "octaves", "±", "moved", "price"),
        [
            (
                *name,
                _number(row.overlap_below, ".3f"),
                _number(row.overlap_present, ".3f"),
                _number(row.quiet_octaves, ".4f"),
                _number(row.quiet_error, ".4f"),
                _number(row.quiet_moved, ".1f"),
                _number(row.price, ".0f") + ("" if row.confirmed else "?"),
            )
            for name, row in zip(names, told.rows, strict=True)
        ],
        right="  rrrrrr",
    )
    say()
    print_table(
        ("score", "share", "alpha", "top holds", "gini", "error", "sweeps"),
        [
            (
                *name,
                f"{row.setting.alpha:.6g}",
                _number(row.top_share, ".1%"),
                _number(row.gini, ".3f"),
                _number(row.error, ".0e"),
                _number(row.sweeps, "d"),
            )
            for name, row in zip(names, told.rows, strict=True)
        ],
        right="  rrrrr",
    )
    for row in told.rows:
        if row.problem:
            complain(f"not solved: {row.setting.score} at a share of {row.setting.share:.3f}: {row.problem}")
    say()
    for line in LEGEND:
        say(line.format(top=told.top, far=FROM_FAR * told.top, buyers=BUYERS))
    for advice in told.advice:
        say()
        share = "none" if advice.share is None else f"{advice.share:.3g}"
        say(f"Recommended share for {advice.score}: {share}")
        for reason in advice.reasons:
            say(f"  - {reason}")
    say()
    say("A larger share counts the standing of endorsers for more and as a rule makes a place dearer for fresh ones; a")
    say("smaller one is calmer and leaves lambda room to grow. Measured on these nights only: run it again later.")


def steadiness(
    network: Network,
    night: Night = None,
    top: Top = None,
    rate: Annotated[
        float | None, typer.Option(help="Share of links that a crawl misses; default: measured on the stored nights.")
    ] = None,
    draws: Annotated[
        int | None, typer.Option(min=2, max=100_000, help="Resampling runs to check against; default: by size.")
    ] = None,
    seed: Annotated[int, typer.Option(min=0, help="Of the random draws; the same seed gives the same result.")] = 0,
    count: Annotated[int, typer.Option(min=1, help="How many places of each score to list.")] = 20,
    as_json: AsJson = False,
) -> None:
    """How much of each top place is crawl luck: the band of places consistent with links missed at random."""
    place = place_of(network)
    from swaygauge.night.work import work_for
    from swaygauge.study.picture import steadiness_chart
    from swaygauge.study.steady import steadiness as study

    told = study(work_for(place.file), _day(night), top=top, rate=rate, draws=draws, seed=seed)
    with reader_of(place) as reader:
        names = reader.names(place.network, {node for each in told.scores for node in each.node_ids})
    shown = [
        (each.score, each.noise, each.check, [visible(names[node], limit=40) for node in each.node_ids])
        for each in told.scores
    ]
    subtitle = f"{told.night}, links missed at {told.rate:.2%}; bars: places consistent with that noise"
    chart = steadiness_chart(shown, title=f"{place.title}: how steady places are", subtitle=subtitle)
    kept = _keep(place, told.night, "steadiness", told.as_json(names), chart)
    if as_json:
        print_json(told.as_json(names))
        return
    _say_steadiness(place, told)
    for each in told.scores:
        _say_score(each, names, count)
    say()
    say("A band says what missed links alone could do to a place. It is not a test of whether a move is real.")
    _say_kept(kept)


def _say_steadiness(place: Place, told: Steadiness) -> None:
    say(f"{place.title}: how steady places are on {told.night}, {told.links} links in effect")
    if told.flicker is None:
        say(f"Links are missed at a rate of {told.rate:.3%}, as given.")
    else:
        say(
            f"Links of fetched sources were missing at a rate of {told.rate:.3%} a night (median of "
            f"{told.flicker.nights} fine nights, {told.flicker.lowest:.3%} to {told.flicker.highest:.3%});"
        )
        say("links that really ended are among them, so the crawl alone misses fewer.")


def _say_score(told: Steady, names: dict[int, str], count: int) -> None:
    from swaygauge.study.picture import WELL
    from swaygauge.study.resampling import NORMAL
    from swaygauge.study.steady import ordinary_width

    noise, check = told.noise, told.check
    say()
    say(f"{told.score}, first {len(noise.nodes)} places; an ordinary band spans {ordinary_width(noise):.0f} place(s)")
    listed = min(count, len(noise.nodes))
    print_table(
        ("place", "band", "value sd", "resampled sd", "in band", "name"),
        [
            (
                int(noise.rank[at]),
                f"{noise.first[at]}-{noise.last[at]}",
                f"{noise.sd[at]:.4f}",
                f"{check.spread[at]:.4f}",
                f"{check.inside[at]:.0%}",
                names[told.node_ids[at]],
            )
            for at in range(listed)
        ],
        right="rrrrr",
    )
    say(f"Checked with {check.draws} resampling runs: {check.inside.mean():.1%} of all places were inside their band.")
    poor = [at for at in range(len(noise.nodes)) if check.inside[at] < WELL]
    if poor:
        worst = sorted(poor, key=lambda at: check.inside[at])[:5]
        few = ", ".join(f"{visible(names[told.node_ids[at]])} ({check.inside[at]:.1%})" for at in worst)
        say(f"The band holds less than {WELL:.0%} of the time for {len(poor)} of {len(noise.nodes)} nodes: {few}.")
    tail = ", ".join(f"{c} sd {share:.2%} ({NORMAL[c]:.2%})" for c, share in check.beyond.items())
    say(f"Values further from expected than so many sd, and what a normal law would give: {tail}.")
    if any(share > 1.5 * NORMAL[c] for c, share in check.beyond.items()):
        say("So the sd must not be read as a normal law's: one missed link can be most of what a value loses.")


def _keep(place: Place, night: date, kind: str, result: dict[str, Any], chart: dict[str, Any]) -> list[str]:
    """Write the result and the chart; without the library that draws, the chart's description instead."""
    from swaygauge.store.studies import write_study
    from swaygauge.study.picture import can_draw, draw

    def write(suffix: str, text: str) -> str:
        return str(write_study(place.workspace, place.network, night, kind=kind, suffix=suffix, text=text))

    kept = [write("json", json.dumps(result, default=str, indent=2) + "\n")]
    if can_draw():
        kept.append(write("svg", draw(chart)))
    else:
        kept.append(write("vl.json", json.dumps(chart, default=str, indent=2) + "\n"))
        complain(
            "The chart was not drawn: vl-convert-python is not installed (pip install 'swaygauge[desk]'). What it "
            f"shows, in Vega-Lite, is in {kept[-1]}"
        )
    return kept


def _say_kept(kept: list[str]) -> None:
    say()
    for path in kept:
        say(f"kept: {path}")
