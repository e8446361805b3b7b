import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import betanbinom, nbinom

from swaygauge.detect.tails import beta_negative_binomial_tail, count_tails, negative_binomial_tail


@given(st.integers(0, 400), st.floats(0.05, 80.0), st.floats(1e-3, 100.0))
@settings(deadline=None)
def test_negative_binomial_tail_against_scipy(count: int, shape: float, mean: float) -> None:
    ours = negative_binomial_tail(np.array([count]), shape=np.array([shape]), mean=np.array([mean]))[0]
    assert ours == pytest.approx(nbinom.sf(count - 1, shape, shape / (shape + mean)), rel=1e-9, abs=1e-290)


# scipy.stats.betanbinom knows whole shapes only; its sf is 1 - cdf, so compare where that still has digits
@given(st.integers(0, 60), st.integers(1, 20), st.floats(0.01, 20.0), st.floats(2.5, 12.0))
@settings(deadline=None)
def test_beta_negative_binomial_tail_against_scipy(count: int, shape: int, mean: float, exponent: float) -> None:
    ours = beta_negative_binomial_tail(count, shape=float(shape), mean=mean, exponent=exponent)
    b = mean * (exponent - 1) / shape
    body = betanbinom.pmf(np.arange(count), shape, exponent, b).sum()
    assert ours == pytest.approx(1.0 - body, abs=2e-12)


@pytest.mark.parametrize(("shape", "mean", "exponent"), [(1.0, 0.5, 7.0), (4.0, 1.3, 5.0), (0.3, 0.01, 4.0)])
def test_far_tail_keeps_its_digits(shape: float, mean: float, exponent: float) -> None:
    # far out, one more term at a time, summed from the smallest: scipy.stats.betanbinom's masses for a whole shape,
    # and the power law survival(2k) / survival(k) -> 2^-exponent for all
    far = [beta_negative_binomial_tail(k, shape=shape, mean=mean, exponent=exponent) for k in (4000, 8000)]
    assert far[1] / far[0] == pytest.approx(2.0**-exponent, rel=0.01)
    if shape == int(shape):
        b = mean * (exponent - 1) / shape
        masses = betanbinom.pmf(np.arange(4000, 400_000), int(shape), exponent, b)
        assert far[0] == pytest.approx(masses[::-1].sum(), rel=0.002)


@pytest.mark.parametrize(("shape", "mean", "exponent"), [(1.0, 0.5, 7.0), (6.0, 3.0, 5.0)])
def test_no_step_where_the_far_tail_takes_over(shape: float, mean: float, exponent: float) -> None:
    tails = np.array([beta_negative_binomial_tail(k, shape=shape, mean=mean, exponent=exponent) for k in range(1, 200)])
    assert (np.diff(tails) < 0).all()
    ratio = tails[1:] / tails[:-1]
    late = tails[1:] < 1e-4
    assert (np.diff(ratio[late]) > -1e-4).all()  # the ratio climbs smoothly towards 1


def test_mean_is_the_mean() -> None:
    # the sum of the survival function is the mean
    total = sum(beta_negative_binomial_tail(k, shape=2.5, mean=1.7, exponent=7.0) for k in range(1, 3000))
    assert total == pytest.approx(1.7, rel=1e-6)


def test_heavier_exponents_are_never_more_surprised_far_out() -> None:
    count = np.array([0, 1, 5, 20, 60, 200], np.int64)
    ones = np.ones(6)
    tails = count_tails(count, shape=2.0 * ones, mean=0.5 * ones, exponents=(7.0, 5.0, 4.0))
    assert tails[:, 0].tolist() == [1.0, 1.0, 1.0]
    assert (np.diff(tails[:, 3:], axis=0) > 0).all()
    light = negative_binomial_tail(count, shape=2.0 * ones, mean=0.5 * ones)
    assert (tails >= light).all()
    assert (tails[0] == light)[:2].all()
