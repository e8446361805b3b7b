"""The morning brief: sound or not, what needs a person, how unusual that is, how the network as a whole moved."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator
from statistics import median
from typing import TYPE_CHECKING, Any

from swaygauge.config.place import Place
from swaygauge.visible import visible

if TYPE_CHECKING:
    from swaygauge.store import Reader
    from swaygauge.store.views import NightView

WIDTH = 100
SHOWN_NAMES = 3  # names in a line about the network as a whole
USUAL = 14  # stored nights that "usual" is measured on
CAUTION = (
    "These are measurements of links, not evidence of what anyone meant or did. An honest wave of newcomers can look "
    "like a manufactured one. Check the sources before acting on a name, and follow the law that applies to you."
)


def _wrap(text: str, indent: str = "  ", first: str | None = None) -> Iterator[str]:
    yield from textwrap.wrap(
        text,
        WIDTH,
        initial_indent=indent if first is None else first,
        subsequent_indent=indent if first is None else " " * len(first),
        break_long_words=False,
        break_on_hyphens=False,
    ) or [""]


def _share(value: float | None) -> str:
    return "unknown" if value is None else f"{100 * value:.1f} %"


def _soundness(view: NightView) -> Iterator[str]:
    row, facts = view.row, view.facts
    words = {
        "fine": "sound",
        "repair": "degraded: scored after carrying what was missing",
        "hold": "held: not scored, nothing was compared",
    }
    state = {"refused": "refused: the file could not be used", "missing": "missing: no file"}
    yield f"Can it be trusted?  {state.get(row.state) or words.get(row.outcome, row.outcome)}"
    if row.reason:
        yield from _wrap(row.reason)
    profile = facts.get("profile")
    if not profile:
        return
    kept = f"; {_share(profile['kept'])} of the links before were seen again" if profile.get("kept") is not None else ""
    yield from _wrap(f"{profile['links']:,} links between {profile['nodes']:,} nodes in {row.input_file}{kept}.")
    upkeep = facts.get("upkeep")
    if upkeep:
        yield from _wrap(
            f"Carried: {upkeep['carried_links']:,} links of {upkeep['carried_sources']:,} sources that were not "
            f"fetched (their changes cannot be seen). Waiting one night: {upkeep['waiting_links']:,} links. "
            f"New: {upkeep['new_links']:,}; lost: {upkeep['lost_links']:,}; returned: {upkeep['returned_links']:,}."
        )
    if row.gap_nights:
        yield from _wrap(
            f"{row.gap_nights} night(s) missing since {row.previous}: moves are over {row.gap_nights + 1} nights."
        )
    failed = [check for check in view.checks if not check.ok]
    crashed = [check for check in view.checks if check.crashed]
    tail = f"; {len(crashed)} could not be run" if crashed else ""
    yield from _wrap(f"Checks: {len(view.checks) - len(failed)} of {len(view.checks)} passed{tail}.")


def _alerts(place: Place, view: NightView) -> Iterator[str]:
    told = view.alerts
    shown = told[: place.attention]
    yield f"What needs reading?  {len(told)} alert{'s' if len(told) != 1 else ''}"
    for number, alert in enumerate(shown, 1):
        yield from _wrap(visible(alert.sentence, limit=None), first=f"  {number:>2}. {alert.kind}: ")
    if len(told) > len(shown):
        yield from _wrap(
            f"and {len(told) - len(shown)} more: swaygauge alerts {place.network} --night {view.row.night}"
        )


def _usual(place: Place, reader: Reader, view: NightView) -> Iterator[str]:
    earlier = [row for row in reader.nights(place.network) if row.state == "published" and row.night < view.row.night]
    nights = [row.night for row in earlier][-USUAL:]
    if not nights:
        yield from _wrap(
            "How unusual is that?  This is the first stored night: there is nothing to compare with.", "  ", ""
        )
        return
    counts = dict.fromkeys(nights, 0)
    for alert in reader.alerts(place.network, first=nights[0], last=nights[-1]):
        if alert.night in counts:
            counts[alert.night] += 1
    values = sorted(counts.values())
    yield from _wrap(
        f"How unusual is that?  The {len(values)} scored nights before had a median of {median(values):g} alerts, and "
        f"{values[-1]} at most.",
        "  ",
        "",
    )


def _named(facts: dict[str, Any], key: str) -> str:
    """How many, and the first few by name."""
    told = facts.get("named", {}).get(key, {"count": 0, "names": []})
    if not told["count"]:
        return "nobody"
    names = [visible(name) for name in told["names"][:SHOWN_NAMES]]
    more = f" and {told['count'] - len(names)} more" if told["count"] > len(names) else ""
    return f"{', '.join(names)}{more}"


def _most_endorsed(facts: dict[str, Any]) -> str:
    told = facts.get("named", {}).get("zeroed")
    return f" (the most endorsed: {', '.join(visible(name) for name in told['names'][:SHOWN_NAMES])})" if told else ""


def _network(facts: dict[str, Any]) -> Iterator[str]:
    for score in ("katz", "fairshare"):
        whole = facts.get(f"network.{score}")
        if whole:
            order = "unknown" if whole["tau_b"] is None else f"{whole['tau_b']:.3f}"
            yield from _wrap(
                f"{score}, top {whole['depth']}: {_named(facts, f'entered.{score}')} entered, "
                f"{_named(facts, f'left.{score}')} left; order agreement (tau-b) {order}, rank-biased overlap "
                f"{whole['overlap']:.3f}."
            )
    pin, bounds = facts.get("pin"), facts.get("bounds")
    if pin and bounds:
        if bounds["upper"] == 0:
            yield from _wrap("The network has no cycle: lambda is exactly 0 and any alpha is legal.")
        else:
            yield from _wrap(
                f"alpha {pin['alpha']:.6g}, fixed on {pin['night']}; alpha x lambda is "
                f"{pin['alpha'] * bounds['upper']:.3f} tonight (past scores.katz.limit a new alpha is fixed)."
            )
    leaks = facts.get("leaks")
    if leaks:
        yield from _wrap(
            f"Plain eigenvector centrality would leave {leaks['zeroed_count']:,} endorsed nodes at zero"
            f"{_most_endorsed(facts)}. {leaks['components']:,} strong components, the largest with "
            f"{leaks['largest']:,} nodes; {_share(leaks['upstream_share'])} of all nodes lead into it and "
            f"{_share(leaks['downstream_share'])} are only led to."
        )


def brief_lines(place: Place, reader: Reader, view: NightView) -> Iterator[str]:
    """The brief of one stored night as lines of text."""
    row = view.row
    yield f"{place.title}: night of {row.night}"
    yield ""
    yield from _soundness(view)
    yield ""
    yield from _alerts(place, view)
    yield ""
    yield from _usual(place, reader, view)
    yield ""
    if row.state == "published":
        yield "The network as a whole"
        yield from _network(view.facts)
        yield ""
    yield from _wrap(CAUTION, "")
