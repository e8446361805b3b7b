"""Sentences word for word: they are what page, terminal, log and export show."""

from dataclasses import replace
from datetime import date
from typing import Any

import numpy as np
import pytest

from swaygauge.episodes import describe, describe_night
from swaygauge.records import Alert, NetworkMove, RuleResult, Upkeep, Verdict
from swaygauge.visible import visible

NAMES = {7: "harbournews.example", 8: "ferrydeals.example", 9: "ostrelpost.example"}
NIGHT: dict[str, Any] = {"previous": "2031-03-09", "gap_nights": 0, "degraded": False, "rescored": False}
COUNTS = ("new_links", "lost_links", "returned_links", "expired_links")
SCORES = {"fairshare": {"rank_before": 812, "rank_now": 37, "value_before": 2.0, "value_now": 9.0}}


def name_of(node: int) -> str:
    return visible(NAMES[node])


def node_alert(kind: str, *, direction: str, before: int = 812, now: int = 37, **facts: Any) -> Alert:
    base = NIGHT | dict.fromkeys(COUNTS, 0) | {"expected_new": 1.2, "expected_lost": 0.04, "endorsements_before": 40}
    facts = base | {"scores": SCORES, "provisional": False} | facts
    return Alert("k", date(2031, 3, 10), kind, 7, "fairshare", direction, before, now, 3.0, facts)


def network_alert(kind: str, *, size: float = 1.0, direction: str = "", **facts: Any) -> Alert:
    return Alert("k", date(2031, 3, 10), kind, -1, "", direction, 0, 0, size, NIGHT | facts)


@pytest.mark.parametrize(
    ("alert", "sentence"),
    [
        (
            node_alert("surge", direction="rose", new_links=64),
            "harbournews.example rose from place 812 to place 37 under fair share: 64 new endorsements in one night, "
            "1.2 expected.",
        ),
        (
            node_alert("surge", direction="fell", before=37, now=1812, lost_links=1, gap_nights=2),
            "harbournews.example fell from place 37 to place 1,812 under fair share: 1 endorsement lost since "
            "2031-03-09 (2 nights missing in between), under 0.1 expected.",
        ),
        (
            node_alert("swing", direction="rose", new_links=1),
            "harbournews.example rose from place 812 to place 37 under fair share in one night, its score +350 %: "
            "1 new endorsement.",
        ),
        (
            node_alert("swing", direction="rose"),
            "harbournews.example rose from place 812 to place 37 under fair share in one night, its score +350 %: none "
            "of its own endorsements came or went.",
        ),
        (
            node_alert(
                "drift", direction="rose", nights=20, window=14, window_new=28, window_lost=3, window_expected=1.3
            ),
            "harbournews.example rose from place 812 to place 37 under fair share over 20 nights, a little at a time: "
            "28 new endorsements and 3 lost in the last 14 of these, 1.3 expected.",
        ),
        (
            node_alert("arrival", direction="came", before=0, now=120, new_links=31, returned=False),
            "harbournews.example was first seen and came in at place 120 under fair share, with 31 endorsements.",
        ),
        (
            node_alert("arrival", direction="came", before=0, now=120, returned_links=1, returned=True),
            "harbournews.example came back at place 120 under fair share, with 1 endorsement.",
        ),
        (
            node_alert("departure", direction="left", before=40, now=0, lost_links=38, judged=True),
            "harbournews.example left from place 40 under fair share: 38 of its 40 endorsements went with it.",
        ),
        (
            node_alert("rename", direction="came", old=8, old_rank=40, old_score="katz", shared=31, endorsers=36),
            "harbournews.example came as ferrydeals.example was leaving place 40 under Katz; 31 of the 36 that endorse "
            "either endorse both. It may be a new name of the same node.",
        ),
        (
            network_alert("held", reasons=["kept 0.31, expected at least 0.40", "lost 0.61, expected at most 0.50"]),
            "The snapshot of 2031-03-10 is held and not scored (kept 0.31, expected at least 0.40; lost 0.61, expected "
            "at most 0.50). The last accepted night is 2031-03-09.",
        ),
        (
            network_alert("degraded", reasons=["lost 0.08"], capped=False, carried_links=310, carried_sources=12),
            "The snapshot of 2031-03-10 is incomplete (lost 0.08) and was scored as degraded: 310 links of 12 sources "
            "stand as last seen.",
        ),
        (
            network_alert("overdue", nights=1, first="2031-03-09", last="2031-03-09"),
            "No snapshot came for 2031-03-09: 1 night missing before 2031-03-10.",
        ),
        (
            network_alert("overdue", nights=3, first="2031-03-07", last="2031-03-09"),
            "No snapshot came from 2031-03-07 to 2031-03-09: 3 nights missing before 2031-03-10.",
        ),
        (
            network_alert("coverage_step", what="returned", coverage_links=4100),
            "Coverage changed on 2031-03-10: 4,100 links known from before came back; both nights are compared alike.",
        ),
        (
            network_alert("coverage_step", what="rise"),
            "The snapshot of 2031-03-10 covers much more than before and is a new baseline; nodes are compared again "
            "from the next night on.",
        ),
        (
            network_alert("lambda_jump", size=0.25, before=20.0, now=25.0, nodes=[8, 9], links=2, without=20.1),
            "The spectral radius rose from 20 to 25 (+25 %): 2 new links among 2 nodes (ferrydeals.example, "
            "ostrelpost.example); without them it is 20.1.",
        ),
        (
            network_alert("lambda_jump", size=0.25, before=20.0, now=25.0),
            "The spectral radius rose from 20 to 25 (+25 %) in one night.",
        ),
        (
            network_alert("lambda_jump", size=1.0, before=0.0, now=1.0, nodes=[], links=0, without=1.0),
            "The spectral radius rose from 0 (no cycles) to 1 in one night; no group of new links among a few nodes "
            "explains it.",
        ),
        (
            network_alert(
                "displacement", direction="fell", score="katz", displaced=28, deepest=90, entered=60, arrived=55
            ),
            "28 nodes within the first 90 places fell under Katz without a change of their own score: 60 nodes came in "
            "above (55 of them new).",
        ),
    ],
)
def test_sentences(alert: Alert, sentence: str) -> None:
    assert describe(alert, name_of) == sentence


def test_hostile_names_are_inert() -> None:
    hostile = node_alert("surge", direction="rose", new_links=64)
    for name in ("<b>\x1b[2J", "a\u202eb", "x" * 10_000, "line\nbreak"):
        sentence = describe(hostile, lambda node, name=name: visible(name))
        assert sentence.isprintable()
        assert len(sentence) < 400


def test_an_unknown_kind_is_not_passed_over() -> None:
    with pytest.raises(KeyError):
        describe(network_alert("surprise"), name_of)


NOBODY = np.zeros(0, np.int32)
UPKEEP = Upkeep(0, 0, 0, 3, 64, 12, 0, NOBODY, NOBODY)


def test_a_sound_night() -> None:
    move = NetworkMove("fairshare", 100, 0.9871, 0.9932, 0.03, 0, 0.01)
    surge = node_alert("surge", direction="rose", new_links=64)
    swings = [replace(surge, kind="swing")] * 2
    lines = describe_night(
        date(2031, 3, 10), Verdict("fine", ()), alerts=[surge, *swings], upkeep=UPKEEP, moves=[move], history=30
    )
    assert lines == (
        "The snapshot of 2031-03-10 is sound.",
        "64 new links, 3 returned, 12 lost.",
        "Top 100 under fair share: 3.0 % new in it, overlap 0.993, rank correlation of those that stayed 0.987.",
        "3 alerts: 1 surge, 2 swing.",
    )


def test_a_short_history_after_a_gap() -> None:
    move = NetworkMove("katz", 50, None, 0.5, 0.5, 2, 0.5)
    early = node_alert("swing", direction="rose", provisional=True)
    lines = describe_night(date(2031, 3, 10), Verdict("fine", ()), alerts=[early], moves=[move], history=1)
    assert lines == (
        "The snapshot of 2031-03-10 is sound.",
        "Top 50 under Katz: 50.0 % new in it, overlap 0.500, with 2 nights missing in between.",
        "1 earlier night to compare with: until there are 8, only arrivals, departures, large swings and the state of "
        "the network are reported.",
        "1 alert: 1 swing (1 provisional: the history is short).",
    )


def test_held_and_degraded_nights() -> None:
    rule = RuleResult("kept", "kept", 0.3, "at least 0.4", "hold", ok=False)
    held = Verdict("hold", (rule,), reasons=("kept 0.30",))
    assert describe_night(date(2031, 3, 10), held) == (
        "The snapshot of 2031-03-10 is held and not scored (kept 0.30).",
    )
    repaired = describe_night(
        date(2031, 3, 10),
        Verdict("repair", (), reasons=("lost 0.08",)),
        upkeep=replace(UPKEEP, carried_links=310, carried_sources=12, waiting_links=4),
        history=20,
    )
    assert repaired == (
        "The snapshot of 2031-03-10 is incomplete and scored as degraded (lost 0.08).",
        "64 new links, 3 returned, 12 lost; 310 links of 12 sources not fetched tonight stand as last seen, 4 missing "
        "for one night still count.",
        "No alerts.",
    )
