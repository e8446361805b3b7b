"""Loosening: median -+ 5 robust sd of fine nights, never tighter than set, never past the stated ends."""

from __future__ import annotations

import dataclasses

import pytest

from swaygauge.checks.limits import Limits, loosened
from swaygauge.records import Profile

LIMITS = Limits()


def nights(sound: Profile, fact: str, values: list[float | None]) -> list[Profile]:
    return [dataclasses.replace(sound, **{fact: value}) for value in values]


def test_quiet_nights_do_not_tighten(sound: Profile) -> None:
    fitted = loosened(LIMITS, nights(sound, "kept", [0.99] * 14))
    assert fitted == LIMITS


def test_a_busy_network_gets_wider_limits(sound: Profile) -> None:
    # median .93, absolute deviations 0 .01 .01 .02 .02 -> MAD .01
    fitted = loosened(LIMITS, nights(sound, "kept", [0.91, 0.92, 0.93, 0.94, 0.95]))
    assert fitted.repair_kept == pytest.approx(0.93 - 5 * 1.482602218505602 * 0.01)
    fitted = loosened(LIMITS, nights(sound, "lost", [0.02, 0.03, 0.04, 0.05, 0.06]))
    assert fitted.repair_lost == pytest.approx(0.04 + 5 * 1.482602218505602 * 0.01)


@pytest.mark.parametrize(
    ("fact", "values", "end"),
    [("kept", [0.3, 0.5, 0.7], 0.6), ("lost", [0.1, 0.3, 0.5], 0.2), ("shrunk", [0.1, 0.2, 0.3], 0.15)],
)
def test_never_past_the_end(sound: Profile, fact: str, values: list[float | None], end: float) -> None:
    assert getattr(loosened(LIMITS, nights(sound, fact, values)), f"repair_{fact}") == end


def test_a_limit_set_looser_by_hand_stays(sound: Profile) -> None:
    own = Limits(repair_kept=0.5, repair_lost=0.4)
    fitted = loosened(own, nights(sound, "kept", [0.99] * 14))
    assert (fitted.repair_kept, fitted.repair_lost) == (0.5, 0.4)


def test_fewer_than_three_nights_change_nothing(sound: Profile) -> None:
    assert loosened(LIMITS, nights(sound, "kept", [0.7, 0.8])) == LIMITS
    assert loosened(LIMITS, nights(sound, "kept", [None, None, 0.7, 0.8])) == LIMITS
    assert loosened(LIMITS, nights(sound, "kept", [0.7, 0.8, 0.9])).repair_kept == 0.6


def test_only_the_last_fourteen_count(sound: Profile) -> None:
    assert loosened(LIMITS, nights(sound, "kept", [0.7] * 20 + [0.99] * 14)) == LIMITS
    assert loosened(LIMITS, nights(sound, "kept", [0.7] * 20 + [0.99] * 6)).repair_kept == pytest.approx(0.7)


def test_other_limits_stay_as_they_are(sound: Profile) -> None:
    busy = nights(sound, "hub", [0.3] * 14)
    assert loosened(LIMITS, busy) == LIMITS
