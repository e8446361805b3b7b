"""How many nodes swung on the trailing nights, and which ratio that makes a swing on this network."""

from __future__ import annotations

from typing import Final

import numpy as np

from swaygauge.detect.thresholds import Swing
from swaygauge.records import Ints

NEEDED: Final = 3  # nights before the ratio is raised
CUT: Final = 0.9  # nightly counts beyond this quantile count as the quantile: one eventful night does not decide


def ratios_of(options: Swing) -> tuple[float, ...]:
    """The ladder: the ratio of the settings and those it may be raised to."""
    return (options.ratio, *options.raised)


def after_night(counts: Ints, tonight: Ints, *, nights: int) -> Ints:
    """(t, ratios) swings of the trailing nights under each ratio, with one more night, the oldest forgotten."""
    return np.vstack((counts, tonight))[-nights:].astype(np.int64)


def choose_ratio(counts: Ints, options: Swing) -> float:
    """The smallest ratio of the ladder whose swings stayed within the budget, else the largest.

    >>> choose_ratio(np.array([[9, 4, 1, 0, 0, 0, 0, 0]] * 5), Swing(budget=3.0))
    3.0
    """
    ladder = ratios_of(options)
    if len(counts) < NEEDED:
        return ladder[0]
    for ratio, nightly in zip(ladder, counts.T.astype(np.float64), strict=True):
        if float(np.mean(np.minimum(nightly, np.quantile(nightly, CUT)))) <= options.budget:
            return ratio
    return ladder[-1]
