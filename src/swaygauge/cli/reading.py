"""Commands that read what nights have stored. They answer from the catalog and the series; nothing is computed anew."""

from __future__ import annotations

from datetime import date, datetime
from typing import TYPE_CHECKING, Annotated, Any

import typer

from swaygauge.cli.brief import brief_lines
from swaygauge.cli.chart import draw_path
from swaygauge.cli.context import AsJson, Network, place_of, reader_of
from swaygauge.cli.output import print_json, print_table, say
from swaygauge.errors import NotInStore
from swaygauge.visible import visible

if TYPE_CHECKING:
    from swaygauge.store import Reader

SCORES = ("katz", "fairshare")
DAY = ["%Y-%m-%d"]
Night = Annotated[
    datetime | None, typer.Option("--night", formats=DAY, help="The night; default: the newest scored one.")
]
Score = Annotated[str, typer.Option("--score", help="katz or fairshare.")]
Count = Annotated[int, typer.Option("--count", min=1, max=100_000, help="How many rows.")]


def _day(value: datetime | None) -> date | None:
    return value.date() if value else None


def _night(reader: Reader, network: str, night: datetime | None, *, scored: bool = True) -> date:
    asked = _day(night)
    if asked:
        return asked
    row = reader.latest(network, state="published" if scored else None)
    if row is None:
        raise NotInStore(f"{network}: no night is stored yet. Run: swaygauge night {network}")
    return row.night


def _check_score(score: str) -> None:
    if score not in SCORES:
        raise typer.BadParameter(f"expected one of {', '.join(SCORES)}, got {score!r}", param_hint="--score")


def _as_dicts(rows: Any) -> list[dict[str, Any]]:
    from dataclasses import asdict

    return [asdict(row) for row in rows]


def brief(network: Network, night: Night = None, as_json: AsJson = False) -> None:
    """The morning brief: is the night sound, what moved, how unusual it is."""
    place = place_of(network)
    reader = reader_of(place)
    view = reader.night(place.network, _night(reader, place.network, night, scored=False))
    if as_json:
        from dataclasses import asdict

        print_json(asdict(view))
        return
    for line in brief_lines(place, reader, view):
        say(line)


def standing(
    network: Network,
    night: Night = None,
    score: Score = "katz",
    first: Annotated[int, typer.Option(min=1, help="First place to show.")] = 1,
    count: Count = 20,
    search: Annotated[str, typer.Option(help="Only names that contain this text.")] = "",
    as_json: AsJson = False,
) -> None:
    """The ranking of a night: place, best and worst place consistent with the proven error, value, move."""
    _check_score(score)
    place = place_of(network)
    reader = reader_of(place)
    day = _night(reader, place.network, night)
    rows = reader.standing(place.network, day, score=score, first=first, count=count, search=search)
    if as_json:
        print_json({"network": place.network, "night": day, "score": score, "rows": _as_dicts(rows)})
        return
    say(f"{place.title}: standing on {day} under {score}")
    print_table(
        ("place", "between", "before", "value", "name"),
        [
            (
                row.rank,
                str(row.best) if row.best == row.worst else f"{row.best}-{row.worst}",
                row.rank_before or "-",
                f"{row.value:.4f}",
                row.name,
            )
            for row in rows
        ],
        right="rrrr",
    )
    if not rows:
        say("no node matches." if search else "no node holds such a place.")


def moves(
    network: Network,
    night: Night = None,
    score: Score = "katz",
    direction: Annotated[str, typer.Option(help="rose, fell, came or left; default: all.")] = "",
    within: Annotated[
        int, typer.Option(min=0, help="Only nodes whose better place is this or better; 0 = all.")
    ] = 1000,
    count: Count = 20,
    as_json: AsJson = False,
) -> None:
    """The largest moves of a night, in octaves: +1 means the place number was halved."""
    _check_score(score)
    if direction not in ("", "rose", "fell", "came", "left"):
        raise typer.BadParameter(f"expected rose, fell, came or left, got {direction!r}", param_hint="--direction")
    place = place_of(network)
    reader = reader_of(place)
    day = _night(reader, place.network, night)
    rows = reader.moves(place.network, day, score=score, count=count, direction=direction, within=within)
    if as_json:
        print_json({"network": place.network, "night": day, "score": score, "rows": _as_dicts(rows)})
        return
    view = reader.night(place.network, day)
    against = f" against {view.row.previous}" if view.row.previous else ""
    gap = f" ({view.row.gap_nights} night(s) missing between)" if view.row.gap_nights else ""
    say(f"{place.title}: moves on {day}{against}{gap} under {score}")
    print_table(
        ("move", "before", "now", "octaves", "value before", "value now", "name"),
        [
            (
                row.direction,
                row.rank_before or "-",
                row.rank_now or "-",
                "-" if row.octaves is None else f"{row.octaves:+.2f}",
                "-" if row.value_before is None else f"{row.value_before:.4f}",
                "-" if row.value_now is None else f"{row.value_now:.4f}",
                row.name,
            )
            for row in rows
        ],
        right=" rrrrr",
    )


def alerts(
    network: Network,
    night: Night = None,
    since: Annotated[datetime | None, typer.Option(formats=DAY, help="All nights from this one on.")] = None,
    kind: Annotated[str, typer.Option(help="Only this kind.")] = "",
    as_json: AsJson = False,
) -> None:
    """Every alert of a night, or of all nights since one, in the order they should be read."""
    place = place_of(network)
    reader = reader_of(place)
    first = _day(since) or _night(reader, place.network, night, scored=False)
    rows = reader.alerts(place.network, first=first, last=date.max if since else first, kind=kind)
    if as_json:
        print_json(_as_dicts(rows))
        return
    for row in rows:
        say(f"{row.night}  {row.kind:<13} {visible(row.sentence, limit=None)}")
    if not rows:
        say(f"no alerts {'since' if since else 'on'} {first}" + (f" of kind {kind}" if kind else "") + ".")


def _node(reader: Reader, network: str, text: str) -> tuple[int, str]:
    matches = reader.find_node(network, text)
    if matches and matches[0].how != "close":
        return matches[0].node, matches[0].name
    near = ", ".join(visible(match.name) for match in matches[:5])
    raise NotInStore(f"{network}: no node is called {visible(text)!r}." + (f" Close: {near}." if near else ""))


def trace(
    network: Network,
    node: Annotated[str, typer.Argument(help="The node's name, exactly, under any of its aliases.")],
    score: Score = "katz",
    nights: Annotated[int, typer.Option(min=1, help="How many nights back.")] = 60,
    as_json: AsJson = False,
) -> None:
    """One node's history: its path through the places, its newest values and its alerts."""
    _check_score(score)
    place = place_of(network)
    reader = reader_of(place)
    number, name = _node(reader, place.network, node)
    points = reader.trace(place.network, number, score=score, nights=nights)
    told = reader.alerts(place.network, first=points[0].night, last=date.max, node=number) if points else ()
    if as_json:
        body = {"network": place.network, "node": number, "name": name, "score": score}
        print_json(body | {"points": _as_dicts(points), "alerts": _as_dicts(told)})
        return
    say(f"{visible(name)} in {place.title}, places under {score}")
    from swaygauge.cli.calendar import on_calendar

    nights_shown = on_calendar(points, place.every_nights)
    for line in draw_path([point.rank if point else None for point in nights_shown]):
        say("  " + line)
    scored = [point for point in points if point.rank is not None]
    if scored:
        last = scored[-1]
        say(f"  {points[0].night} to {points[-1].night}; an open column is a night without a place")
        say(f"  {last.night}: place {last.rank} (between {last.best} and {last.worst}), value {last.value:.6g}")
    else:
        say("  it holds no place on any of these nights")
    for row in told:
        say(f"  {row.night}  {row.kind:<13} {visible(row.sentence, limit=None)}")


def nights(network: Network, as_json: AsJson = False) -> None:
    """Every stored night with its verdict, what was carried, and its alerts."""
    place = place_of(network)
    reader = reader_of(place)
    rows = reader.nights(place.network)
    if as_json:
        print_json(_as_dicts(rows))
        return
    counts: dict[date, int] = {}
    for alert in reader.alerts(place.network, first=date.min, last=date.max):
        counts[alert.night] = counts.get(alert.night, 0) + 1
    print_table(
        ("night", "state", "verdict", "missing before", "alpha", "alerts", "file"),
        [
            (
                row.night,
                row.state,
                row.outcome,
                row.gap_nights or "",
                "" if row.alpha is None else f"{row.alpha:.6g}",
                counts.get(row.night, 0),
                row.input_file,
            )
            for row in rows
        ],
        right="   rrr",
    )
    for stored in rows:
        if stored.reason:
            say(f"{stored.night}: {visible(stored.reason, limit=None)}")
