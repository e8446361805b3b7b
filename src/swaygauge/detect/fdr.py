"""Which of many p-values to act on."""

from __future__ import annotations

import numpy as np

from swaygauge.records import Flags, Floats


def benjamini_hochberg(p: Floats, *, q: float, tests: int | None = None) -> Flags:
    """(k,) which hypotheses are rejected at false discovery rate q.

    tests: how many hypotheses there are in all, when ``p`` leaves out some that are 1; default len(p). The bar is only
    valid over all of them, never over a selection made by looking at tonight. Benjamini and Hochberg 1995: reject the
    m smallest, m = max {i : p_(i) <= q i / tests}.

    >>> benjamini_hochberg(np.array([0.9, 0.001, 0.02]), q=0.05).tolist()
    [False, True, True]
    """
    tests = len(p) if tests is None else tests
    order = np.argsort(p, kind="stable")
    passing = np.flatnonzero(p[order] <= q * np.arange(1, len(p) + 1) / max(tests, 1))
    rejected = np.zeros(len(p), np.bool_)
    if len(passing):
        rejected[order[: passing[-1] + 1]] = True
    return rejected
