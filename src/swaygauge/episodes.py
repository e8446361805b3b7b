"""The wording of findings: one plain sentence per alert, a few per night. Page, terminal, log and export all use these.

Sentences state what was measured, never why somebody did something. Names come in already made visible.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from datetime import date
from typing import Any, Final

from swaygauge.records import Alert, NetworkMove, Upkeep, Verdict

NameOf = Callable[[int], str]
SCORE_WORDS: Final = {"katz": "Katz", "fairshare": "fair share"}
SHOWN_NODES: Final = 5


def describe(alert: Alert, name_of: NameOf) -> str:
    """One sentence about one alert. ``name_of`` gives the name of a node, made visible.

    Raises KeyError for a kind that has no wording.
    """
    return WORDING[alert.kind](alert, name_of)


def describe_night(
    night: date,
    verdict: Verdict,
    *,
    alerts: Sequence[Alert] = (),
    upkeep: Upkeep | None = None,
    moves: Sequence[NetworkMove] = (),
    history: int = 0,
    quiet_history: int = 8,
) -> tuple[str, ...]:
    """What to know before the alerts: is the snapshot sound, what moved as a whole, how much is there to read."""
    lines = [_snapshot_line(night, verdict)]
    if upkeep is not None:
        lines.append(_upkeep_line(upkeep))
    lines += [_network_move_line(move) for move in moves]
    if verdict.outcome != "hold":
        if history < quiet_history:
            lines.append(
                f"{_count(history, 'earlier night')} to compare with: until there are {quiet_history}, only arrivals, "
                "departures, large swings and the state of the network are reported."
            )
        lines.append(_alerts_line(alerts))
    return tuple(lines)


def _surge(alert: Alert, name_of: NameOf) -> str:
    facts = alert.facts
    rising = alert.direction == "rose"
    count, expected = (
        (facts["new_links"], facts["expected_new"]) if rising else (facts["lost_links"], facts["expected_lost"])
    )
    what = _count(count, "new endorsement") if rising else f"{_count(count, 'endorsement')} lost"
    return f"{_moved(alert, name_of)}: {what} {_since(alert)}, {_decimal(expected)} expected."


def _swing(alert: Alert, name_of: NameOf) -> str:
    standing = alert.facts["scores"][alert.score]
    before, now = standing["value_before"], standing["value_now"]
    change = "" if not before or now is None else f", its score {_percent(now / before - 1.0)}"
    return f"{_moved(alert, name_of)} {_since(alert)}{change}: {_own_links(alert.facts)}."


def _drift(alert: Alert, name_of: NameOf) -> str:
    facts = alert.facts
    lost = f" and {facts['window_lost']:,} lost" if facts["window_lost"] else ""
    over = f"in the last {facts['window']} of these" if facts["window"] < facts["nights"] else "in that time"
    return (
        f"{_moved(alert, name_of)} over {_count(facts['nights'], 'night')}, a little at a time: "
        f"{_count(facts['window_new'], 'new endorsement')}{lost} {over}, {_decimal(facts['window_expected'])} expected."
    )


def _arrival(alert: Alert, name_of: NameOf) -> str:
    how = "came back" if alert.facts["returned"] else "was first seen and came in"
    gained = alert.facts["new_links"] + alert.facts["returned_links"]
    return (
        f"{name_of(alert.node)} {how} at place {alert.rank_now:,} under {_score(alert.score)}, with "
        f"{_count(gained, 'endorsement')}."
    )


def _departure(alert: Alert, name_of: NameOf) -> str:
    facts = alert.facts
    gone = facts["lost_links"] + facts["expired_links"]
    unseen = f" ({facts['expired_links']:,} of them from sources not fetched for too long)"
    detail = f"{gone:,} of its {_count(facts['endorsements_before'], 'endorsement')} went with it"
    return (
        f"{name_of(alert.node)} left from place {alert.rank_before:,} under {_score(alert.score)}: {detail}"
        f"{unseen if facts['expired_links'] else ''}."
    )


def _rename(alert: Alert, name_of: NameOf) -> str:
    facts = alert.facts
    return (
        f"{name_of(alert.node)} came as {name_of(facts['old'])} was leaving place {facts['old_rank']:,} under "
        f"{_score(facts['old_score'])}; {facts['shared']:,} of the {facts['endorsers']:,} that endorse "
        "either endorse both. It may be a new name of the same node."
    )


def _held(alert: Alert, name_of: NameOf) -> str:
    return (
        f"The snapshot of {alert.night} is held and not scored{_because(alert.facts['reasons'])}. "
        f"{_last_accepted(alert)}"
    )


def _degraded(alert: Alert, name_of: NameOf) -> str:
    facts = alert.facts
    carried = (
        f": {_count(facts['carried_links'], 'link')} of {_count(facts['carried_sources'], 'source')} stand as last seen"
        if "carried_links" in facts
        else ""
    )
    return (
        f"The snapshot of {alert.night} is incomplete{_because(facts['reasons'])} and was scored as degraded{carried}."
    )


def _overdue(alert: Alert, name_of: NameOf) -> str:
    facts = alert.facts
    span = f"for {facts['first']}" if facts["nights"] == 1 else f"from {facts['first']} to {facts['last']}"
    return f"No snapshot came {span}: {_count(facts['nights'], 'night')} missing before {alert.night}."


def _coverage_step(alert: Alert, name_of: NameOf) -> str:
    facts = alert.facts
    if facts["what"] == "rebaselined":
        return (
            f"The snapshots held up to {alert.night} agree with each other and are the new baseline; nodes are "
            "compared again from the next night on."
        )
    if facts["what"] == "rise":
        return (
            f"The snapshot of {alert.night} covers much more than before and is a new baseline; nodes are compared "
            "again from the next night on."
        )
    coverage = facts.get("coverage_links", 0)
    how = (
        "were last seen too long ago and expired together"
        if facts["what"] == "expired"
        else "known from before came back"
    )
    return f"Coverage changed on {alert.night}: {_count(coverage, 'link')} {how}; both nights are compared alike."


def _lambda_jump(alert: Alert, name_of: NameOf) -> str:
    facts = alert.facts
    rise = (
        f"rose from {facts['before']:.4g} to {facts['now']:.4g} ({_percent(alert.size)})"
        if facts["before"] > 0
        else f"rose from 0 (no cycles) to {facts['now']:.4g}"
    )
    if "nodes" not in facts:
        return f"The spectral radius {rise} in one night."
    if not facts["nodes"]:
        return f"The spectral radius {rise} in one night; no group of new links among a few nodes explains it."
    listed = ", ".join(name_of(node) for node in facts["nodes"][:SHOWN_NODES])
    more = len(facts["nodes"]) - SHOWN_NODES
    return (
        f"The spectral radius {rise}: {_count(facts['links'], 'new link')} among {_count(len(facts['nodes']), 'node')} "
        f"({listed}{f' and {more:,} more' if more > 0 else ''}); without them it is {facts['without']:.4g}."
    )


def _displacement(alert: Alert, name_of: NameOf) -> str:
    facts = alert.facts
    if alert.direction == "fell":
        cause = f"{_count(facts['entered'], 'node')} came in above ({facts['arrived']:,} of them new)"
    else:
        cause = f"{_count(facts['dropped'], 'node')} dropped out above ({facts['departed']:,} of them gone)"
    return (
        f"{_count(facts['displaced'], 'node')} within the first {facts['deepest']:,} places {alert.direction} under "
        f"{_score(facts['score'])} without a change of their own score: {cause}."
    )


WORDING: Final[Mapping[str, Callable[[Alert, NameOf], str]]] = {
    "held": _held,
    "lambda_jump": _lambda_jump,
    "degraded": _degraded,
    "overdue": _overdue,
    "coverage_step": _coverage_step,
    "displacement": _displacement,
    "surge": _surge,
    "rename": _rename,
    "arrival": _arrival,
    "departure": _departure,
    "swing": _swing,
    "drift": _drift,
}


def _snapshot_line(night: date, verdict: Verdict) -> str:
    if verdict.outcome == "hold":
        return f"The snapshot of {night} is held and not scored{_because(verdict.reasons)}."
    if verdict.outcome == "repair":
        return f"The snapshot of {night} is incomplete and scored as degraded{_because(verdict.reasons)}."
    if verdict.starts_baseline:
        return f"The snapshot of {night} is a new baseline."
    return f"The snapshot of {night} is sound."


def _upkeep_line(upkeep: Upkeep) -> str:
    changed = f"{upkeep.new_links:,} new links, {upkeep.returned_links:,} returned, {upkeep.lost_links:,} lost"
    carried = (
        f"; {_count(upkeep.carried_links, 'link')} of {_count(upkeep.carried_sources, 'source')} not fetched tonight "
        f"stand as last seen, {upkeep.waiting_links:,} missing for one night still count"
    )
    return f"{changed}{carried if upkeep.carried_links or upkeep.waiting_links else ''}."


def _network_move_line(move: NetworkMove) -> str:
    gap = f", with {_count(move.gap_nights, 'night')} missing in between" if move.gap_nights else ""
    order = "" if move.tau_b is None else f", rank correlation of those that stayed {move.tau_b:.3f}"
    return (
        f"Top {move.depth:,} under {_score(move.score)}: {100 * move.turnover:.1f} % new in it, "
        f"overlap {move.overlap:.3f}{order}{gap}."
    )


def _alerts_line(alerts: Sequence[Alert]) -> str:
    if not alerts:
        return "No alerts."
    kinds = dict.fromkeys(alert.kind for alert in alerts)
    counts = ", ".join(f"{sum(alert.kind == kind for alert in alerts):,} {kind.replace('_', ' ')}" for kind in kinds)
    provisional = sum(bool(alert.facts.get("provisional")) for alert in alerts)
    note = f" ({provisional:,} provisional: the history is short)" if provisional else ""
    return f"{_count(len(alerts), 'alert')}: {counts}{note}."


def _moved(alert: Alert, name_of: NameOf) -> str:
    return (
        f"{name_of(alert.node)} {alert.direction} from place {alert.rank_before:,} to place {alert.rank_now:,} under "
        f"{_score(alert.score)}"
    )


def _since(alert: Alert) -> str:
    gap = alert.facts["gap_nights"]
    return (
        "in one night" if gap == 0 else f"since {alert.facts['previous']} ({_count(gap, 'night')} missing in between)"
    )


def _own_links(facts: Mapping[str, Any]) -> str:
    words = (
        ("new_links", "new endorsement", ""),
        ("returned_links", "returned endorsement", ""),
        ("lost_links", "endorsement", " lost"),
        ("expired_links", "endorsement", " expired"),
    )
    parts = [f"{_count(facts[name], noun)}{after}" for name, noun, after in words if facts[name]]
    return ", ".join(parts) if parts else "none of its own endorsements came or went"


def _last_accepted(alert: Alert) -> str:
    previous = alert.facts["previous"]
    return f"The last accepted night is {previous}." if previous else "There is no accepted night yet."


def _because(reasons: Sequence[str]) -> str:
    return f" ({'; '.join(reasons)})" if reasons else ""


def _score(score: str) -> str:
    return SCORE_WORDS.get(score, score)


def _count(count: int, noun: str) -> str:
    return f"{count:,} {noun}{'' if count == 1 else 's'}"


def _percent(share: float) -> str:
    return f"{100 * share:+.3g} %"


def _decimal(number: float) -> str:
    """An expected count: whole when large, one decimal when not, never a bare zero."""
    if number >= 100:
        return f"{number:,.0f}"
    return f"{number:.1f}" if number >= 0.1 else "under 0.1"
