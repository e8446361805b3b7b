"""What run_rules must say, in plain Python: a test holds the two against each other, long replays use this one."""

from __future__ import annotations

import operator
from collections.abc import Mapping, Sequence

from swaygauge.checks.rules import Rule
from swaygauge.records import RuleResult


def run_plain_rules(rules: Sequence[Rule], facts: Mapping[str, float | None]) -> tuple[RuleResult, ...]:
    """Results in the order of the rules."""
    return tuple(
        RuleResult(r.name, r.column, facts[r.column], r.expected, r.severity, _holds(r, facts[r.column]), own=r.own)
        for r in rules
    )


def _holds(rule: Rule, value: float | None) -> bool:
    if value is None:
        return False
    under = operator.lt if rule.below else operator.le
    return (rule.low is None or value >= rule.low) and (rule.high is None or under(value, rule.high))
