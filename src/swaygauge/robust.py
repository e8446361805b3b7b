"""Robust location and spread: the median and the median absolute deviation, scaled to the normal distribution."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np

from swaygauge.records import Floats

# 1 / Phi^-1(3/4): for normal data this many median absolute deviations make one standard deviation.
SD_PER_MAD: Final = 1.482602218505602


def mad(values: Floats | Sequence[float]) -> float:
    """Median absolute deviation from the median of ``values`` (n >= 1), in their unit.

    >>> mad([1.0, 2.0, 4.0, 9.0, 9.0])
    3.0
    """
    data = np.asarray(values, dtype=np.float64)
    return float(np.median(np.abs(data - np.median(data))))


def robust_sd(values: Floats | Sequence[float]) -> float:
    """Standard deviation estimated from the median absolute deviation: half of the values may be wild.

    ``values`` are n >= 1 finite numbers; the result is 0 as soon as more than half of them are equal.

    >>> round(robust_sd([1.0, 2.0, 4.0, 9.0, 900.0]), 4)
    4.4478
    """
    return SD_PER_MAD * mad(values)


def robust_z(values: Floats | Sequence[float]) -> Floats:
    """(value - median) / robust sd for every value; with no spread 0 at the median and +-inf elsewhere.

    The modified z-score of Iglewicz and Hoaglin 1993 with the exact constant instead of 0.6745.

    >>> robust_z([1.0, 1.0, 1.0, 2.0]).tolist()
    [0.0, 0.0, 0.0, inf]
    """
    data = np.asarray(values, dtype=np.float64)
    away = data - np.median(data)
    sd = robust_sd(data)
    if sd == 0:
        return np.where(away == 0, 0.0, np.copysign(np.inf, away))
    return away / sd
