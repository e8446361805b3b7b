"""Failed rules in plain words, each number with what it is a share of."""

from __future__ import annotations

from swaygauge.checks.rules import SEVERITIES, number
from swaygauge.records import Profile, RuleResult


def reasons(profile: Profile, results: tuple[RuleResult, ...], fixed: dict[str, str]) -> tuple[str, ...]:
    """One sentence per fact that failed, by its severest rule; the severest first.

    ``fixed``: rule -> its limit in words before it was loosened, for the rules that were.
    """
    worst: dict[str, RuleResult] = {}
    for result in results:
        if result.ok or result.crashed:
            continue
        known = worst.get(result.column)
        if known is None or SEVERITIES.index(result.severity) > SEVERITIES.index(known.severity):
            worst[result.column] = result
    ordered = sorted(worst.values(), key=lambda result: -SEVERITIES.index(result.severity))
    crashed = [
        f"rule {result.rule} could not run ({result.crashed}): a fault of the check, it says nothing about the data"
        for result in results
        if result.crashed
    ]
    return (*crashed, *(_sentence(profile, result, fixed) for result in ordered))


def _sentence(profile: Profile, result: RuleResult, fixed: dict[str, str]) -> str:
    if result.value is None:
        return f"{result.column} is not known, though it should be"
    usual = f" (loosened from {fixed[result.rule]})" if result.rule in fixed else ""
    shown = _unlike_its_limit(result.value, result.expected)
    return f"{_finding(profile, result.column, shown)}, expected {result.expected}{usual}"


def _unlike_its_limit(value: float, expected: str) -> str:
    """The value with as many digits as it takes to tell it from its limit.

    >>> _unlike_its_limit(0.949996, "at least 0.95")
    '0.949996'
    """
    shown = (number(value, digits) for digits in (4, 6, 9, 15))
    return next((text for text in shown if text not in expected.split()), number(value))


def _finding(profile: Profile, column: str, v: str) -> str:
    said = {
        "kept": f"kept {v} of {number(profile.base_links)} previous links",
        "lost": f"{v} of {number(profile.base_sources)} sources with two or more links have none left",
        "hub": f"{v} of the {number(profile.base_hubs)} largest sources lost more than half of their links",
        "cut": f"{v} sources had more links and now have exactly {number(profile.longest_list)}, the longest list",
        "shrunk": f"{v} of {number(profile.base_lists)} sources with five or more links lost over a fifth of them",
        "unfetched": f"the fetch list leaves out {v} of the sources with two or more links",
        "node_ratio": f"{number(profile.nodes)} nodes are {v} of the usual {number(profile.base_nodes)}",
        "history": f"{v} accepted night(s) to compare with, so limits stand as they are",
        "duplicate_share": f"{v} of {number(profile.rows)} rows repeat a link",
        "dropped_share": f"{v} of {number(profile.rows)} rows were left out as unusable",
        "new_nodes": f"{v} of {number(profile.nodes)} nodes were never seen before",
        "links": f"{v} links",
        "nodes": f"{v} nodes",
    }
    return said.get(column, f"{column} is {v}")
