import numpy as np
import pytest

from swaygauge.detect.sums import DOWN, UP, DriftAlarms, ScoreSums, choose_limit, roughness

ONE = np.ones(1)


def ranks(*places: int) -> np.ndarray:
    return np.array(places, np.int32)


def feed(sums: ScoreSums, changes: list[float], places: list[int]) -> ScoreSums:
    for at, change in enumerate(changes):
        sums = sums.step(np.array([change]), ONE, ranks(places[at]), ranks(places[at + 1]), clip=4.0, allowance=0.5)
    return sums


def test_sums_add_what_exceeds_the_allowance_and_remember_where_they_began() -> None:
    sums = feed(ScoreSums.empty(2, 14, 1), [0.2, 1.0, 1.0], [400, 400, 320, 250])
    assert sums.total[UP].ravel().tolist() == [1.0, 1.0]
    assert sums.total[DOWN].ravel().tolist() == [0.0, 0.0]
    assert sums.start_rank[UP, 0, 0] == 400
    assert sums.nights[UP, 0, 0] == 2
    assert sums.octaves[UP, 0, 0] == pytest.approx(np.log2(400 / 250))
    assert sums.start_rank[DOWN, 0, 0] == 250  # a sum at zero begins tonight


def test_a_single_night_counts_for_at_most_the_clip() -> None:
    assert feed(ScoreSums.empty(1, 14, 1), [1e9], [100, 10]).total[UP, 0, 0] == 3.5


def test_no_unit_no_step() -> None:
    sums = feed(ScoreSums.empty(1, 14, 1), [1.5], [100, 90])
    still = sums.step(np.array([9.0]), np.zeros(1), ranks(90), ranks(80), clip=4.0, allowance=0.5)
    assert still.total[UP, 0, 0] == sums.total[UP, 0, 0] == 1.0
    assert still.octaves[UP, 0, 0] == pytest.approx(np.log2(100 / 80))
    gone = sums.step(np.array([np.nan]), ONE, ranks(90), ranks(0), clip=4.0, allowance=0.5)
    assert gone.total[UP, 0, 0] == 1.0


def test_a_rough_node_is_measured_in_its_own_roughness() -> None:
    # root mean square of its nights, with five of usual size: sqrt((5 + 14 x 9) / 19); divided by its root
    z = np.full((14, 1), 3.0)
    rough = np.sqrt((5 + 14 * 9) / 19)
    assert roughness(z)[0] == pytest.approx(rough)
    sums = ScoreSums(np.zeros((2, 1, 1)), np.zeros((2, 1, 1)), *np.zeros((2, 2, 1, 1), np.int32), z)
    stepped = sums.step(np.array([3.0]), ONE, ranks(50), ranks(40), clip=4.0, allowance=0.5)
    assert stepped.total[UP, 0, 0] == pytest.approx(3.0 / np.sqrt(rough) - 0.5)
    assert roughness(np.full((14, 1), np.nan))[0] == 1.0


def test_reset_touches_only_what_it_is_told_to() -> None:
    sums = feed(ScoreSums.empty(2, 14, 1), [1.0, 1.0], [400, 320, 250])
    which = np.zeros((2, 2, 1), np.bool_)
    which[UP, 1] = True
    after = sums.reset(which, ranks(250))
    assert after.total[UP].ravel().tolist() == [1.0, 0.0]
    assert after.start_rank[UP].ravel().tolist() == [400, 250]


def test_following_others_keeps_what_is_known() -> None:
    sums = feed(ScoreSums.empty(1, 14, 1), [1.5], [400, 320])
    moved = sums.follow(np.array([7], np.int32), np.array([3, 7, 9], np.int32))
    assert moved.total[UP, 0].tolist() == [0.0, 1.0, 0.0]
    assert np.isfinite(moved.z).sum(axis=0).tolist() == [0, 1, 0]


def test_limits_follow_the_budget() -> None:
    alarms = DriftAlarms()
    for number in range(20, 48):
        node = np.array([number, 100 + number])
        # two a night at the lowest limit, one at the next, none beyond
        alarms = alarms.after(number, node, np.zeros(2, np.int64), np.array([0, 0]), window=28)
        one = np.array([number])
        alarms = DriftAlarms(
            *(
                np.append(kept, more)
                for kept, more in (
                    (alarms.night, one),
                    (alarms.node, one),
                    (alarms.direction, [0]),
                    (alarms.limit, [1]),
                )
            )
        )
    options = {"limits": 3, "first": 2, "window": 28}
    assert choose_limit(alarms, 48, 28, budget=2.0, **options) == 0
    assert choose_limit(alarms, 48, 28, budget=1.0, **options) == 1
    assert choose_limit(alarms, 48, 28, budget=0.5, **options) == 2
    assert choose_limit(alarms, 48, 13, budget=2.0, **options) == 2  # too early to tell
    assert choose_limit(DriftAlarms(), 99, 28, budget=0.5, **options) == 0


def test_cooldown_is_by_node_direction_and_limit() -> None:
    none = np.zeros(0, np.int64)
    alarms = DriftAlarms(none, none, none, none).after(30, np.array([5]), np.array([UP]), np.array([1]), window=28)
    asked = np.array([5, 6])
    assert alarms.rested(43, asked, UP, 1, cooldown=14).tolist() == [False, True]
    assert alarms.rested(44, asked, UP, 1, cooldown=14).tolist() == [True, True]
    assert alarms.rested(31, asked, DOWN, 1, cooldown=14).tolist() == [True, True]
    assert alarms.rested(31, asked, UP, 0, cooldown=14).tolist() == [True, True]
