"""The rules a profile is judged by: sentences that are true or false of one snapshot."""

from __future__ import annotations

import dataclasses
import math
from dataclasses import dataclass
from typing import Final

from swaygauge.checks.limits import Limits
from swaygauge.records import Profile

SEVERITIES: Final = ("note", "repair", "hold")  # mildest first

# Facts that need an accepted night before.
COMPARED: Final = ("kept", "lost", "hub", "cut", "shrunk", "node_ratio", "unfetched", "new_nodes")


@dataclass(frozen=True)
class Rule:
    """One limit on one fact, or with ``known`` that the fact was measured at all."""

    name: str
    column: str
    severity: str  # one of SEVERITIES
    low: float | None = None
    high: float | None = None
    below: bool = False  # high itself is already too much
    known: bool = False
    own: bool = False  # a limit that the network's owner set: no agreement of held nights lifts it

    @property
    def expected(self) -> str:
        """The limit in words.

        >>> Rule("hub", "hub", "repair", high=0.05, below=True).expected
        'below 0.05'
        """
        if self.known:
            return "a number"
        if self.low is not None and self.high is not None:
            return f"between {number(self.low)} and {number(self.high)}"
        if self.low is not None:
            return f"at least {number(self.low)}"
        return f"{'below' if self.below else 'at most'} {number(self.high)}"


def number(value: float | None, digits: int = 4) -> str:
    """A count with thousands separated, a share with up to ``digits`` digits.

    >>> number(18240), number(0.98765), number(None)
    ('18,240', '0.9877', 'unknown')
    """
    if value is None:
        return "unknown"
    return f"{value:,.0f}" if float(value).is_integer() and abs(value) > 1 else f"{value:.{digits}g}"


def rules(profile: Profile, limits: Limits) -> tuple[Rule, ...]:
    """Every rule that applies to ``profile``; each fact a rule reads has a rule that it is known.

    What cannot be known is not passed on a blank, the rule is left out: comparisons on a first night, ``unfetched``
    without a fetch list, limits that the owner did not set.
    """
    limiting = [rule for rule in (*_own(limits), *_compared(limits)) if _applies(rule, profile)]
    severest: dict[str, str] = {}
    for rule in limiting:
        severest[rule.column] = max(severest.get(rule.column, "note"), rule.severity, key=SEVERITIES.index)
    known = [Rule(f"{column}_known", column, severity, known=True) for column, severity in severest.items()]
    return (*known, *limiting)


def facts(profile: Profile) -> dict[str, float | None]:
    """The profile as one row of numbers, shares of rows included; None where a fact is not known."""
    row: dict[str, float | None] = {}
    for field in dataclasses.fields(profile):
        value = getattr(profile, field.name)
        if field.name not in ("night", "fetch_list"):
            row[field.name] = None if value is None or math.isnan(value) else float(value)
    row["duplicate_share"] = profile.duplicate_share
    row["dropped_share"] = profile.dropped_share
    return row


def _applies(rule: Rule, profile: Profile) -> bool:
    if rule.column == "unfetched" and not profile.fetch_list:
        return False
    return profile.history > 0 or rule.column not in COMPARED


def _own(limits: Limits) -> list[Rule]:
    floors = {"links": limits.min_links, "nodes": limits.min_nodes}
    ceilings = {"links": limits.max_links, "nodes": limits.max_nodes}
    shares = {
        "duplicate_share": limits.max_duplicate_share,
        "dropped_share": limits.max_dropped_share,
        "new_nodes": limits.max_new_node_share,
    }
    return [
        *(Rule(f"min_{column}", column, "hold", low=low, own=True) for column, low in floors.items() if low),
        *(Rule(f"max_{column}", column, "hold", high=high, own=True) for column, high in ceilings.items() if high),
        *(Rule(column, column, "hold", high=high, own=True) for column, high in shares.items() if high < 1),
    ]


def _compared(limits: Limits) -> list[Rule]:
    return [
        Rule("history", "history", "note", low=limits.min_history),
        Rule("kept", "kept", "repair", low=limits.repair_kept),
        Rule("kept_hold", "kept", "hold", low=limits.hold_kept),
        Rule("lost", "lost", "repair", high=limits.repair_lost),
        Rule("lost_hold", "lost", "hold", high=limits.hold_lost),
        Rule("hub", "hub", "repair", high=limits.repair_hub, below=True),
        Rule("cut", "cut", "repair", high=limits.repair_cut, below=True),
        Rule("shrunk", "shrunk", "repair", high=limits.repair_shrunk),
        Rule("unfetched", "unfetched", "repair", high=limits.repair_unfetched),
        Rule("unfetched_hold", "unfetched", "hold", high=limits.hold_unfetched),
        Rule("nodes", "node_ratio", "note", low=limits.note_nodes_low, high=limits.note_nodes_high),
        Rule("nodes_hold", "node_ratio", "hold", low=limits.hold_nodes),
    ]
