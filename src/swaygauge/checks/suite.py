"""Great Expectations judges the one-row profile. Only numbers go in: no node name ever reaches it."""

from __future__ import annotations

import functools
import logging
import os
import warnings
from collections.abc import Mapping, Sequence
from typing import Any, Final

from swaygauge.checks.rules import Rule
from swaygauge.errors import RuleError
from swaygauge.records import RuleResult

CHATTY: Final = "great_expectations.data_context.types.base"
SEVERITY: Final = {"hold": "critical", "repair": "warning", "note": "info"}  # ours -> Great Expectations'


def run_rules(rules: Sequence[Rule], facts: Mapping[str, float | None]) -> tuple[RuleResult, ...]:
    """Judge one row of ``facts`` by ``rules``; results in the order of the rules.

    A limit never passes on a blank: it is put on the column's maximum, which is a blank for a blank row, where a limit
    on the column's values would skip it. A rule that could not run (a column that is not there, a fault in the
    library) has ``crashed`` set and ``ok`` False. Raises RuleError when nothing could be judged at all.
    """
    import pandas as pd

    gx, gxe = _library()
    frame = pd.DataFrame({column: [value] for column, value in facts.items()}, dtype="float64")
    suite = gx.ExpectationSuite(name="snapshot", expectations=[_expectation(gxe, rule) for rule in rules])
    try:
        batch = _one_row().get_batch(batch_parameters={"dataframe": frame})
        outcome = batch.validate(suite, result_format="BOOLEAN_ONLY")
    except Exception as problem:  # whatever the library raises, it is no finding about the data
        raise RuleError(f"the checks could not run ({_said(problem)}); the snapshot was not judged.") from problem
    # Results come back in another order than the suite's.
    by_rule = {result.expectation_config.meta["rule"]: result for result in outcome.results}
    return tuple(_result(rule, by_rule.get(rule.name), facts) for rule in rules)


def _expectation(gxe: Any, rule: Rule) -> Any:
    common = {"column": rule.column, "severity": SEVERITY[rule.severity], "meta": {"rule": rule.name}}
    if rule.known:
        return gxe.ExpectColumnValuesToNotBeNull(**common)
    return gxe.ExpectColumnMaxToBeBetween(min_value=rule.low, max_value=rule.high, strict_max=rule.below, **common)


def _result(rule: Rule, outcome: Any, facts: Mapping[str, float | None]) -> RuleResult:
    crashed = "it gave no result" if outcome is None else _crash(outcome.exception_info)
    return RuleResult(
        rule=rule.name,
        column=rule.column,
        value=facts.get(rule.column),
        expected=rule.expected,
        severity=rule.severity,
        ok=not crashed and bool(outcome.success),
        crashed=crashed,
        own=rule.own,
    )


def _crash(info: Mapping[str, Any] | None) -> str:
    """Why a rule crashed; "" when it ran. Fine is a flat mapping, a crash is often one mapping per metric."""
    info = info or {}
    if info.get("raised_exception") is False:
        return ""
    parts = [info, *(part for part in info.values() if isinstance(part, Mapping))]
    messages = [str(part["exception_message"]) for part in parts if part.get("exception_message")]
    return messages[0].splitlines()[0] if messages else "no reason given"


def _said(problem: Exception) -> str:
    return f"{type(problem).__name__}: {problem}".splitlines()[0]


def _library() -> tuple[Any, Any]:
    os.environ.setdefault("GX_ANALYTICS_ENABLED", "false")  # read while the library is imported
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", DeprecationWarning)  # of modules that the library itself imports
            import great_expectations as gx
            import great_expectations.expectations as gxe
    except ModuleNotFoundError as problem:
        raise RuleError(
            f"the checks need a package that is not installed ({problem.name}). Install swaygauge[pipeline]."
        ) from problem
    return gx, gxe


@functools.cache
def _one_row() -> Any:
    """The batch definition every profile is read through; kept for the process, holds no data."""
    gx, _ = _library()
    logging.getLogger(CHATTY).setLevel(logging.WARNING)  # it announces a temporary folder on every start
    context = gx.get_context(mode="ephemeral")
    context.variables.progress_bars = {"globally": False, "metric_calculations": False}
    asset = context.data_sources.add_pandas("profile").add_dataframe_asset("snapshot")
    return asset.add_batch_definition_whole_dataframe("one_row")
