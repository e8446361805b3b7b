import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import nbinom

from swaygauge.detect.counts import (
    CountHistory,
    due_by_standing,
    measure_surprise,
    model_counts,
    remember_counts,
)

COUNTS = st.lists(st.integers(0, 60), min_size=2, max_size=30)


@given(COUNTS, st.data())
@settings(deadline=None)
def test_due_is_shared_by_standing_and_never_more_than_there_was(counts: list[int], data: st.DataObject) -> None:
    standing = np.array(data.draw(st.lists(st.integers(0, 50), min_size=len(counts), max_size=len(counts))), float)
    count = np.array(counts, np.int64)
    due = due_by_standing(count, standing)
    total = due.sum()
    assert total <= count.sum() + 1e-9
    if standing.sum():
        assert due == pytest.approx(standing / standing.sum() * total)
        settled = np.minimum(count, 3 + 3 * due).sum()  # the fixed point it stands for
        assert total == pytest.approx(settled, rel=1e-6)


def test_one_burst_does_not_raise_what_is_due_to_everyone() -> None:
    count = np.zeros(1000, np.int64)
    count[:50] = 1
    calm = due_by_standing(count, np.ones(1000))
    count[999] = 5000
    burst = due_by_standing(count, np.ones(1000))
    assert burst[0] / calm[0] < 1.1


def test_own_history_moves_the_mean_towards_itself() -> None:
    history = CountHistory(np.array([12.0, 0.0]), np.array([2.0, 2.0]), due_squares=1.0, excess_squares=0.5)
    assert history.kappa == 2.0
    model = model_counts(history, np.array([1, 1]), np.array([1.0, 1.0]))
    # gamma prior with shape 2 around 1, then 12 (or 0) counts seen where 2 were due: (2 + 12) / (2 + 2)
    assert model.mean / model.due == pytest.approx([3.5, 0.5])
    assert model.shape == pytest.approx([14.0, 2.0])


def test_kappa_is_recovered_from_gamma_poisson_counts() -> None:
    # counts drawn by scipy.stats.nbinom with shape 2 around their standing
    random = np.random.default_rng(3)
    standing = random.integers(1, 40, 20_000).astype(float)
    history = CountHistory.empty(20_000)
    present = np.ones(20_000, np.bool_)
    for _ in range(30):
        mean = standing / standing.sum() * 6000
        count = nbinom.rvs(2.0, 2.0 / (2.0 + mean), random_state=random).astype(np.int64)
        model = model_counts(history, count, standing)
        history = remember_counts(history, model, present, memory=0.85, dispersion_memory=0.9)
    assert 1.5 < history.kappa < 3.5  # squares are winsorised, so a little above 2


@pytest.mark.parametrize(("due", "excess", "kappa"), [(0.0, 0.0, 1.0), (1.0, -5.0, 50.0), (1.0, 1e6, 0.05)])
def test_kappa_stays_in_its_range(due: float, excess: float, kappa: float) -> None:
    assert CountHistory(np.zeros(1), np.zeros(1), due, excess).kappa == kappa


def test_surprise_is_two_sided_and_only_of_present_nodes() -> None:
    history = CountHistory.empty(4)
    gains = model_counts(history, np.array([9, 0, 9, 1]), np.ones(4))
    losses = model_counts(history, np.array([0, 0, 9, 0]), np.array([5.0, 5.0, 500.0, 5.0]))
    surprise = measure_surprise(gains, losses, np.array([True, True, True, False]), (7.0, 4.0))
    assert surprise.nodes.tolist() == [0, 2]
    assert surprise.rising.tolist() == [True, True]
    assert surprise.p.shape == (2, 2)
    assert (surprise.p[1] >= surprise.p[0]).all()
