import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import false_discovery_control

from swaygauge.detect.fdr import benjamini_hochberg

# Benjamini and Hochberg 1995, section 3.2: fifteen ordered p-values of a study of thrombolysis
PUBLISHED = "0.0001 0.0004 0.0019 0.0095 0.0201 0.0278 0.0298 0.0344 0.0459 0.3240 0.4262 0.5719 0.6528 0.7590 1.000"


def test_the_published_fifteen() -> None:
    p = np.array([float(word) for word in PUBLISHED.split()])
    assert benjamini_hochberg(p, q=0.05).tolist() == [True] * 4 + [False] * 11
    assert int((p <= 0.05 / 15).sum()) == 3  # what Bonferroni rejects there


def test_left_out_ones_count() -> None:
    p = np.array([0.001, 0.3])
    assert benjamini_hochberg(p, q=0.1, tests=100).tolist() == [True, False]
    assert benjamini_hochberg(p, q=0.1, tests=101).tolist() == [False, False]
    assert benjamini_hochberg(np.zeros(0), q=0.1, tests=5).tolist() == []


@given(st.lists(st.floats(0, 1), min_size=1, max_size=50), st.integers(0, 50), st.sampled_from([0.01, 0.1, 0.3]))
@settings(deadline=None)
def test_against_scipys_adjusted_p_values(p: list[float], ones: int, q: float) -> None:
    adjusted = false_discovery_control(np.array(p + [1.0] * ones), method="bh")[: len(p)]
    clear = np.abs(adjusted - q) > 1e-12
    ours = benjamini_hochberg(np.array(p), q=q, tests=len(p) + ones)
    assert (ours == (adjusted <= q))[clear].all()


@pytest.mark.parametrize("q", [0.05, 0.1])
def test_order_does_not_matter(q: float) -> None:
    p = np.random.default_rng(5).random(200) ** 3
    order = np.random.default_rng(6).permutation(200)
    assert (benjamini_hochberg(p, q=q)[order] == benjamini_hochberg(p[order], q=q)).all()
