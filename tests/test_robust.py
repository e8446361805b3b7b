"""Robust statistics against published values."""

from __future__ import annotations

from statistics import NormalDist

import numpy as np
import pytest
from scipy import stats

from swaygauge.robust import SD_PER_MAD, mad, robust_sd, robust_z

# NIST/SEMATECH e-Handbook of Statistical Methods, uranium data of its outlier tests: median 201.37, MAD .995, modified
# z-score of the last 29.9623 (with the exact constant).
URANIUM = [199.31, 199.53, 200.19, 200.82, 201.92, 201.95, 202.18, 245.57]


def test_constant_is_one_over_the_third_quartile_of_the_normal() -> None:
    assert pytest.approx(1 / NormalDist().inv_cdf(0.75), abs=1e-14) == SD_PER_MAD


def test_uranium_example() -> None:
    assert float(np.median(URANIUM)) == pytest.approx(201.37)
    assert mad(URANIUM) == pytest.approx(0.995)
    assert robust_z(URANIUM)[-1] == pytest.approx(29.9623, abs=5e-5)
    # An ordinary z can never pass (n - 1) / sqrt(n) = 2.475 at n = 8.
    assert np.max((np.array(URANIUM) - np.mean(URANIUM)) / np.std(URANIUM, ddof=1)) < 2.475


def test_agrees_with_scipy() -> None:
    values = np.random.default_rng(3).standard_t(2, 101)
    assert robust_sd(values) == pytest.approx(stats.median_abs_deviation(values, scale="normal"), rel=1e-12)


def test_no_spread() -> None:
    assert robust_sd([0.95] * 14) == 0
    assert robust_z([2.0, 2.0, 2.0, 1.0, 3.0]).tolist() == [0, 0, 0, -np.inf, np.inf]
