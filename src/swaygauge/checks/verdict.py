"""From a profile to the verdict on its night, and when held nights become the new baseline."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping, Sequence
from itertools import pairwise

import numpy as np

from swaygauge.checks.limits import Limits, loosened
from swaygauge.checks.rules import Rule, facts, rules
from swaygauge.checks.suite import run_rules
from swaygauge.checks.wording import reasons
from swaygauge.errors import RuleError
from swaygauge.overlap import link_keys
from swaygauge.records import Profile, RuleResult, Snapshot, Verdict

RunRules = Callable[[Sequence[Rule], Mapping[str, float | None]], tuple[RuleResult, ...]]


def judge(
    profile: Profile, limits: Limits | None = None, *, fine_nights: Sequence[Profile] = (), run: RunRules = run_rules
) -> Verdict:
    """Judge one night: fine, repair or hold, by the severest rule that failed. ``run`` judges the rules.

    ``fine_nights``: profiles of the nights accepted as fine, oldest first; repair limits are loosened by them, except
    while there is too little history since the last baseline (then a note says so and the limits stand).
    A rule that crashed says nothing about the data. If it could have held or degraded the night, the night must not
    pass without it: RuleError is raised, with the verdict as far as it goes in ``verdict`` for the record. A crashed
    note is only mentioned.
    """
    fixed = limits or Limits()
    fitted = loosened(fixed, fine_nights) if profile.history >= fixed.min_history else fixed
    applied = rules(profile, fitted)
    results = run(applied, facts(profile))
    failed = {result.rule for result in results if not result.ok and not result.crashed}
    severities = {result.severity for result in results if result.rule in failed}
    verdict = Verdict(
        outcome=next((worst for worst in ("hold", "repair") if worst in severities), "fine"),
        results=results,
        capped=bool(failed & {"cut", "shrunk"}),
        coverage_step=_is_step(profile, fixed),
        reasons=reasons(profile, results, _loosened_rules(applied, rules(profile, fixed))),
    )
    _refuse_crashes(verdict)
    return verdict


def accept_anyway(verdict: Verdict) -> Verdict:
    """A held night that a person accepts: scored like a degraded one, the findings kept."""
    return dataclasses.replace(verdict, outcome="repair")


def rebaseline(verdict: Verdict) -> Verdict:
    """A held night that becomes the new baseline: scored as it stands, the findings kept."""
    return dataclasses.replace(verdict, outcome="fine", rebaselined=True)


def rebaseline_due(verdict: Verdict, held: Sequence[Snapshot], now: Snapshot, limits: Limits | None = None) -> bool:
    """Whether held night ``now`` agrees so well with the held nights in a row before it that it is the new baseline.

    ``held``: the snapshots held directly before, oldest first (no accepted night in between). Each must agree with
    the next by ``limits.agreement``. Never when one of the owner's own limits holds the night, whatever agrees.
    """
    limits = limits or Limits()
    needed = limits.agreeing_nights - 1
    if verdict.outcome != "hold" or len(held) < needed or not _held_by_comparison(verdict):
        return False
    row = [*held[len(held) - needed :], now]
    return all(agreement(earlier, later) >= limits.agreement for earlier, later in pairwise(row))


def agreement(earlier: Snapshot, later: Snapshot) -> float:
    """Share of the ``earlier`` snapshot's links that are in the ``later`` one too."""
    keys = link_keys(later.target, later.source)
    looked_for = link_keys(earlier.target, earlier.source)
    at = np.searchsorted(keys, looked_for)
    inside = at < len(keys)
    return float(np.count_nonzero(keys[at[inside]] == looked_for[inside]) / max(1, len(looked_for)))


def _is_step(profile: Profile, limits: Limits) -> bool:
    if profile.kept is None or profile.node_ratio is None:
        return False
    return profile.kept >= limits.step_kept and profile.node_ratio > limits.step_nodes


def _loosened_rules(applied: Sequence[Rule], fixed: Sequence[Rule]) -> dict[str, str]:
    return {
        rule.name: before.expected
        for rule, before in zip(applied, fixed, strict=True)
        if (rule.low, rule.high) != (before.low, before.high)
    }


def _held_by_comparison(verdict: Verdict) -> bool:
    """Whether nothing but measured differences from earlier nights holds the night."""
    holding = [result for result in verdict.results if result.severity == "hold" and not result.ok]
    return bool(holding) and all(result.value is not None and not result.own for result in holding)


def _refuse_crashes(verdict: Verdict) -> None:
    crashed = [result for result in verdict.results if result.crashed and result.severity != "note"]
    if crashed:
        raise RuleError(_crash_report(crashed), verdict)


def _crash_report(crashed: Sequence[RuleResult]) -> str:
    lines = "".join(f"\n  - {result.rule} ({result.column}): {result.crashed}" for result in crashed)
    return (
        f"{len(crashed)} rule(s) crashed, so the night was not judged and nothing was published; this says nothing "
        f"about the data.{lines}\nMend the rule and run the night again."
    )
