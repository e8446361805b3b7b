from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from swaygauge.errors import ScoreError
from swaygauge.moves import compare_scores, depth_band, entered_left_top, value_ratio
from swaygauge.records import ARRIVED, DEPARTED, MOVED, ScoreSet

Maker = Callable[..., ScoreSet]
VALUES = st.dictionaries(st.integers(0, 60), st.floats(1.0, 1e6), min_size=1, max_size=40)
FIXED = settings(deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])


def test_each_side_of_a_move(score_set: Maker) -> None:
    before = score_set({1: 8.0, 2: 4.0, 3: 2.0, 4: 1.0})
    now = score_set({2: 4.0, 3: 8.0, 4: 1.0, 9: 2.0}, night=2)
    moves = compare_scores(before, now)
    assert moves.ids.tolist() == [1, 2, 3, 4, 9]
    assert moves.status.tolist() == [DEPARTED, MOVED, MOVED, MOVED, ARRIVED]
    assert moves.rank_before.tolist() == [1, 2, 3, 4, 0]
    assert moves.rank_now.tolist() == [0, 2, 1, 4, 3]
    assert moves.octaves[1:4] == pytest.approx([0.0, np.log2(3), 0.0])
    assert value_ratio(moves)[1:4] == pytest.approx([1.0, 4.0, 1.0])
    assert moves.deviation[1:4] == pytest.approx([0.0, np.log(4), 0.0])
    for missing in (moves.octaves, moves.deviation):
        assert np.isnan(missing[[0, 4]]).all()
    assert (moves.night, moves.previous, moves.score) == (now.night, before.night, "katz")
    assert not moves.octaves.flags.writeable


def test_leaving_a_block_of_ties_is_measured_from_its_first_place(score_set: Maker) -> None:
    tied = dict.fromkeys(range(10, 110), 1.0)
    before = score_set(tied | {1: 5.0})
    now = score_set(tied | {1: 5.0, 50: 2.0}, night=2)
    moves = compare_scores(before, now)
    at = moves.ids.tolist().index(50)
    assert (moves.rank_before[at], moves.rank_now[at], moves.octaves[at]) == (2, 2, 0.0)


def test_a_change_common_to_a_depth_band_cancels_in_the_deviation(score_set: Maker) -> None:
    values = {node: 100.0 - node for node in range(64)}
    grown = {node: 1.2 * value for node, value in values.items()}
    grown[40] *= 1.5
    moves = compare_scores(score_set(values), score_set(grown, night=2))
    expected = np.zeros(64)
    expected[40] = np.log(1.5)
    assert moves.deviation == pytest.approx(expected, abs=1e-12)


def test_scores_that_are_not_alike_are_refused(score_set: Maker) -> None:
    values = {1: 1.0, 2: 2.0}
    with pytest.raises(ScoreError, match=r"alpha = 0\.1.*with 0\.2; score 2031-03-01 again"):
        compare_scores(score_set(values), score_set(values, night=2, alpha=0.2))
    with pytest.raises(ScoreError, match="'katz' with 'fairshare'"):
        compare_scores(score_set(values), score_set(values, night=2, score="fairshare"))


def test_depth_bands_are_exact_at_every_octave() -> None:
    for octave in range(4, 31):
        edge = np.array([2**octave - 1, 2**octave], np.int32)
        assert depth_band(edge).tolist() == [max(octave - 4, 0), octave - 3]


def test_entering_and_leaving_the_top(score_set: Maker) -> None:
    before = score_set({1: 9.0, 2: 8.0, 3: 7.0, 4: 1.0})
    now = score_set({2: 8.0, 3: 1.0, 4: 7.0, 5: 9.0}, night=2)
    entered, left = entered_left_top(compare_scores(before, now), 3)
    assert entered.tolist() == [4, 5]
    assert left.tolist() == [1, 3]


@given(VALUES, VALUES)
@FIXED
def test_reversed_nights_give_the_opposite_moves(
    score_set: Maker, first: dict[int, float], second: dict[int, float]
) -> None:
    there = compare_scores(score_set(first), score_set(second, night=2))
    back = compare_scores(score_set(second), score_set(first, night=2))
    assert there.ids.tolist() == back.ids.tolist() == sorted({*first, *second})
    assert there.octaves == pytest.approx(-back.octaves, nan_ok=True)
    assert (there.status == ARRIVED).tolist() == (back.status == DEPARTED).tolist()


@given(VALUES, st.floats(0.5, 2.0))
@FIXED
def test_scaling_one_night_moves_nothing(score_set: Maker, values: dict[int, float], factor: float) -> None:
    scaled = {node: factor * value for node, value in values.items()}
    moves = compare_scores(score_set(values), score_set(scaled, night=2))
    assert moves.deviation == pytest.approx(np.zeros(len(values)), abs=1e-9)
