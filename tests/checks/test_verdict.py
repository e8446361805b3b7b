"""Every rule at, above and below its limit. Limits: common practice, no source."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable

import numpy as np
import pytest

from swaygauge.checks import suite
from swaygauge.checks.limits import Limits
from swaygauge.checks.rules import COMPARED, Rule, facts, rules
from swaygauge.checks.suite import run_rules
from swaygauge.checks.verdict import accept_anyway, agreement, judge, rebaseline, rebaseline_due
from swaygauge.errors import RuleError
from swaygauge.records import Profile, RuleResult, Snapshot, Verdict

TABLE = [
    ("kept", 0.951, "fine"),
    ("kept", 0.95, "fine"),
    ("kept", 0.949, "repair"),
    ("kept", 0.4, "repair"),
    ("kept", 0.399, "hold"),
    ("lost", 0.029, "fine"),
    ("lost", 0.03, "fine"),
    ("lost", 0.031, "repair"),
    ("lost", 0.5, "repair"),
    ("lost", 0.501, "hold"),
    ("hub", 0.04, "fine"),
    ("hub", 0.05, "repair"),
    ("hub", 0.06, "repair"),
    ("hub", 1.0, "repair"),
    ("cut", 4, "fine"),
    ("cut", 5, "repair"),
    ("cut", 2501, "repair"),
    ("shrunk", 0.029, "fine"),
    ("shrunk", 0.03, "fine"),
    ("shrunk", 0.031, "repair"),
    ("shrunk", 1.0, "repair"),
    ("node_ratio", 0.94, "fine"),
    ("node_ratio", 0.5, "fine"),
    ("node_ratio", 0.499, "hold"),
    ("node_ratio", 1.06, "fine"),
    ("unfetched", 0.03, "fine"),
    ("unfetched", 0.031, "repair"),
    ("unfetched", 0.5, "repair"),
    ("unfetched", 0.501, "hold"),
]


@pytest.mark.parametrize(("fact", "value", "outcome"), TABLE)
def test_limits_of_the_table(sound: Profile, fact: str, value: float, outcome: str) -> None:
    profile = dataclasses.replace(sound, fetch_list=True, unfetched=0.0)
    verdict = judge(dataclasses.replace(profile, **{fact: value}))
    assert verdict.outcome == outcome
    assert verdict.capped == (fact in ("cut", "shrunk") and outcome == "repair")
    assert not any(result.crashed for result in verdict.results)


@pytest.mark.parametrize("value", [0.94, 0.95, 1.05, 1.06])
def test_node_ratio_outside_its_usual_range_is_mentioned(sound: Profile, value: float) -> None:
    verdict = judge(dataclasses.replace(sound, node_ratio=value))
    assert verdict.outcome == "fine"
    assert bool(verdict.reasons) == (value in (0.94, 1.06))


@pytest.mark.parametrize(
    ("limits", "at", "beyond"),
    [
        (Limits(min_links=500), {"links": 500}, {"links": 499}),
        (Limits(max_links=500), {"links": 500}, {"links": 501}),
        (Limits(min_nodes=50), {"nodes": 50}, {"nodes": 49}),
        (Limits(max_nodes=50), {"nodes": 50}, {"nodes": 51}),
        (Limits(max_duplicate_share=0.25), {"rows": 400, "duplicates": 100}, {"rows": 400, "duplicates": 101}),
        (Limits(max_dropped_share=0.25), {"rows": 400, "dropped": 100}, {"rows": 400, "dropped": 101}),
        (Limits(max_new_node_share=0.25), {"new_nodes": 0.25}, {"new_nodes": 0.251}),
    ],
    ids=["min_links", "max_links", "min_nodes", "max_nodes", "duplicates", "dropped", "new_nodes"],
)
def test_owners_limits_hold(sound: Profile, limits: Limits, at: dict[str, float], beyond: dict[str, float]) -> None:
    assert judge(dataclasses.replace(sound, **at), limits).outcome == "fine"
    assert judge(dataclasses.replace(sound, **beyond), limits).outcome == "hold"


@pytest.fixture
def first_night(sound: Profile) -> Profile:
    unknown = dict.fromkeys((*COMPARED, "link_ratio", "base_links", "base_sources", "base_hubs", "base_nodes"))
    return dataclasses.replace(sound, history=0, **unknown)


def test_first_night_is_not_compared_but_the_owners_limits_apply(first_night: Profile) -> None:
    verdict = judge(first_night)
    assert verdict.outcome == "fine"
    assert not {result.column for result in verdict.results} & set(COMPARED)
    assert verdict.reasons == ("0 accepted night(s) to compare with, so limits stand as they are, expected at least 3",)
    assert judge(first_night, Limits(min_links=30_000)).outcome == "hold"


def test_short_history_uses_the_limits_as_they_are_and_says_so(sound: Profile) -> None:
    busy = [dataclasses.replace(sound, kept=0.8)] * 14
    night = dataclasses.replace(sound, kept=0.85)
    assert judge(night, fine_nights=busy).outcome == "fine"
    early = judge(dataclasses.replace(night, history=2), fine_nights=busy)
    assert early.outcome == "repair"
    assert any("2 accepted night(s)" in reason for reason in early.reasons)


def test_agrees_with_plain_python(sound: Profile, plain_rules) -> None:
    rng = np.random.default_rng(8)
    limits = Limits(min_links=19_000, max_nodes=3_000, max_duplicate_share=0.02, max_new_node_share=0.001)
    for _ in range(12):
        odd = {fact: rng.choice([0.0, 0.03, 0.05, 0.4, 0.5, 0.95, 1.0]) for fact in COMPARED if rng.random() < 0.6}
        odd["kept"] = rng.choice([None, 0.3, 0.95])
        profile = dataclasses.replace(sound, fetch_list=True, **{"unfetched": 0.0, **odd})
        applied = rules(profile, limits)
        assert run_rules(applied, facts(profile)) == plain_rules(applied, facts(profile))


class TestBlanks:
    @pytest.mark.parametrize("fact", ["kept", "lost", "node_ratio"])
    def test_a_missing_fact_does_not_pass(self, sound: Profile, fact: str) -> None:
        verdict = judge(dataclasses.replace(sound, **{fact: None}))
        assert verdict.outcome == "hold"
        assert verdict.reasons == (f"{fact} is not known, though it should be",)

    @pytest.mark.parametrize("fact", ["hub", "cut", "shrunk"])
    def test_a_missing_repair_fact_degrades(self, sound: Profile, fact: str) -> None:
        assert judge(dataclasses.replace(sound, **{fact: None})).outcome == "repair"

    def test_nan_is_a_blank(self, sound: Profile) -> None:
        assert judge(dataclasses.replace(sound, kept=float("nan"))).outcome == "hold"

    def test_unfetched_is_only_asked_for_with_a_fetch_list(self, sound: Profile) -> None:
        assert judge(sound).outcome == "fine"
        assert judge(dataclasses.replace(sound, fetch_list=True)).outcome == "hold"

    def test_a_limit_alone_already_fails_on_a_blank(self) -> None:
        """The trap: a limit on a column's values skips blanks and passes."""
        limit = Rule("kept", "kept", "repair", low=0.95)
        assert [result.ok for result in run_rules([limit], {"kept": None})] == [False]

    def test_every_fact_that_a_rule_reads_has_a_rule_that_it_is_known(self, sound: Profile) -> None:
        limits = Limits(min_links=1, max_links=9, min_nodes=1, max_nodes=9, max_duplicate_share=0.5)
        every = rules(dataclasses.replace(sound, fetch_list=True), limits)
        assert {rule.column for rule in every} == {rule.column for rule in every if rule.known}
        assert len({rule.name for rule in every}) == len(every)
        assert {rule.column for rule in every} <= facts(sound).keys()


class TestCrashes:
    def test_a_crashed_rule_is_reported_as_such(self) -> None:
        good, bad = Rule("links", "links", "hold", low=1), Rule("odd", "nowhere", "hold", low=1)
        fine, crashed = run_rules([good, bad], {"links": 5.0})
        assert (fine.ok, fine.crashed) == (True, "")
        assert (crashed.ok, crashed.value) == (False, None)
        assert "nowhere" in crashed.crashed

    @pytest.mark.parametrize("severity", ["hold", "repair"])
    def test_the_night_does_not_pass_without_a_rule_that_matters(self, sound, monkeypatch, severity: str) -> None:
        self.add(monkeypatch, Rule("odd", "nowhere", severity, low=1))
        with pytest.raises(RuleError, match=r"odd \(nowhere\).*\nMend the rule") as caught:
            judge(dataclasses.replace(sound, kept=0.9))
        recorded = caught.value.verdict
        assert isinstance(recorded, Verdict)
        assert [result.rule for result in recorded.results if result.crashed] == ["odd"]
        assert recorded.outcome == "repair"  # of the rules that ran; the crash is no finding

    def test_a_crashed_note_is_mentioned(self, sound, monkeypatch) -> None:
        self.add(monkeypatch, Rule("odd", "nowhere", "note", low=1))
        verdict = judge(sound)
        assert verdict.outcome == "fine"
        assert "rule odd could not run" in verdict.reasons[0]

    def test_a_library_that_fails_altogether(self, sound, monkeypatch) -> None:
        def broken() -> object:
            raise OSError("disk on fire")

        monkeypatch.setattr(suite, "_one_row", broken)
        with pytest.raises(RuleError, match="OSError: disk on fire"):
            judge(sound)

    @staticmethod
    def add(monkeypatch: pytest.MonkeyPatch, rule: Rule) -> None:
        monkeypatch.setattr("swaygauge.checks.verdict.rules", lambda *a: (*rules(*a), rule))


def test_reasons_give_the_number_and_its_base(sound: Profile) -> None:
    verdict = judge(dataclasses.replace(sound, kept=0.91, lost=0.6, cut=12))
    assert verdict.outcome == "hold"
    assert verdict.reasons == (
        "0.6 of 1,203 sources with two or more links have none left, expected at most 0.5",
        "kept 0.91 of 18,240 previous links, expected at least 0.95",
        "12 sources had more links and now have exactly 400, the longest list, expected below 5",
    )


def test_reasons_say_when_a_limit_was_loosened(sound: Profile) -> None:
    busy = [dataclasses.replace(sound, kept=kept) for kept in (0.92, 0.93, 0.94) * 4]
    (reason,) = judge(dataclasses.replace(sound, kept=0.5), fine_nights=busy).reasons
    assert reason == "kept 0.5 of 18,240 previous links, expected at least 0.8559 (loosened from at least 0.95)"


@pytest.mark.parametrize(
    ("kept", "ratio", "step"), [(0.93, 1.51, True), (0.93, 1.5, False), (0.929, 1.51, False), (1.0, 3.3, True)]
)
def test_coverage_step(sound: Profile, kept: float, ratio: float, step: bool) -> None:
    verdict = judge(dataclasses.replace(sound, kept=kept, node_ratio=ratio))
    assert verdict.coverage_step == step
    assert verdict.starts_baseline == step
    assert verdict.outcome == ("fine" if kept >= 0.95 else "repair")


def test_accepting_anyway_keeps_the_findings(sound: Profile) -> None:
    held = judge(dataclasses.replace(sound, kept=0.2))
    taken = accept_anyway(held)
    assert (held.outcome, taken.outcome, taken.reasons) == ("hold", "repair", held.reasons)


class TestNewBaseline:
    lists = tuple(range(100))

    def night(self, snapshot_of: Callable[..., Snapshot], day: int, missing: int = 0) -> Snapshot:
        return snapshot_of({s: [200] for s in self.lists[missing:]}, day)

    def hold(self, *results: RuleResult) -> Verdict:
        return Verdict("hold", results or (RuleResult("kept_hold", "kept", 0.1, "at least 0.4", "hold", False),))

    def test_agreement_is_over_the_earlier_night(self, snapshot_of) -> None:
        full, part = self.night(snapshot_of, 0), self.night(snapshot_of, 1, missing=25)
        assert agreement(full, part) == 0.75
        assert agreement(part, full) == 1.0

    @pytest.mark.parametrize(("missing", "due"), [(10, True), (11, False)])
    def test_third_held_night_that_agrees(self, snapshot_of, missing: int, due: bool) -> None:
        held = [self.night(snapshot_of, 0), self.night(snapshot_of, 1)]
        now = self.night(snapshot_of, 2, missing)
        assert rebaseline_due(self.hold(), held, now) is due

    def test_each_time_not_only_the_last(self, snapshot_of) -> None:
        odd, same = self.night(snapshot_of, 0), self.night(snapshot_of, 1, 50)
        assert not rebaseline_due(self.hold(), [odd, same], self.night(snapshot_of, 2, 50))
        assert rebaseline_due(self.hold(), [odd, same, same], self.night(snapshot_of, 3, 50))

    def test_two_held_nights_are_not_enough(self, snapshot_of) -> None:
        assert not rebaseline_due(self.hold(), [self.night(snapshot_of, 0)], self.night(snapshot_of, 1))
        two = Limits(agreeing_nights=2)
        assert rebaseline_due(self.hold(), [self.night(snapshot_of, 0)], self.night(snapshot_of, 1), two)

    def test_never_over_the_owners_limit_or_a_missing_fact(self, snapshot_of) -> None:
        held = [self.night(snapshot_of, day) for day in range(2)]
        now = self.night(snapshot_of, 2)
        own = RuleResult("min_links", "links", 100.0, "at least 500", "hold", False, own=True)
        blank = RuleResult("kept_known", "kept", None, "a number", "hold", False)
        assert not rebaseline_due(self.hold(own), held, now)
        assert not rebaseline_due(self.hold(blank), held, now)
        assert not rebaseline_due(Verdict("repair", ()), held, now)

    def test_the_verdict_of_a_new_baseline(self) -> None:
        verdict = rebaseline(self.hold())
        assert (verdict.outcome, verdict.starts_baseline) == ("fine", True)
