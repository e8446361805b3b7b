"""How surprising a count is: upper tails of the negative binomial and of its heavier relative.

A node's expected number of new links is known only roughly. A gamma-distributed rate makes the count negative
binomial; the tail of that is still too light for real networks, where attention feeds on itself. The
beta-negative-binomial has the same mean and a power tail, so that its small probabilities stay honest.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from scipy.special import betainc, betaln, gammaln

from swaygauge.records import Floats, Ints

EXACT_BELOW: Final = 0.003  # above this the two tails agree well enough, and the light one is cheap
FAR_BELOW: Final = 1e-8  # from here on 1 - (sum from 0) has no digits left
FAR_TERMS: Final = 1000


def negative_binomial_tail(count: Ints, *, shape: Floats, mean: Floats) -> Floats:
    """(k,) P(X >= count) for a negative binomial with this shape r > 0 and mean > 0: variance mean + mean^2 / r.

    The tail is the regularised incomplete beta function I_{m/(m+r)}(count, r); 1 where count is 0.
    """
    tail = np.ones(len(count))
    some = count > 0
    tail[some] = betainc(count[some], shape[some], mean[some] / (mean[some] + shape[some]))
    return tail


def beta_negative_binomial_tail(count: int, *, shape: float, mean: float, exponent: float) -> float:
    """P(X >= count) for the beta-negative-binomial with shape r > 0, this mean > 0 and survival ~ k^-exponent.

    P(X = k) = G(r+k) / (k! G(r)) x B(exponent + r, b + k) / B(exponent, b) with b = mean (exponent - 1) / r.
    """
    if count <= 0:
        return 1.0
    b = mean * (exponent - 1.0) / shape
    near = 1.0 - float(np.sum(_masses(0, count, shape, b, exponent)))
    if near > FAR_BELOW:
        return min(near, 1.0)
    far = _masses(count, FAR_TERMS, shape, b, exponent)
    return float(np.sum(far) + far[-1] * (count + FAR_TERMS) / exponent)


def count_tails(count: Ints, *, shape: Floats, mean: Floats, exponents: Sequence[float]) -> Floats:
    """(tails, k) honest upper tails P(X >= count), one row per exponent: the larger of the light and the heavy form.

    The heavy one is computed only where the light one is small; elsewhere they agree well enough.
    """
    light = negative_binomial_tail(count, shape=shape, mean=mean)
    tails = np.tile(light, (len(exponents), 1))
    for at in np.flatnonzero(light < EXACT_BELOW):
        for row, exponent in enumerate(exponents):
            heavy = beta_negative_binomial_tail(
                int(count[at]), shape=float(shape[at]), mean=float(mean[at]), exponent=exponent
            )
            tails[row, at] = max(light[at], heavy)
    return tails


def _masses(first: int, terms: int, shape: float, b: float, exponent: float) -> Floats:
    """P(X = first), ..., P(X = first + terms - 1), each from the one before."""
    log_first = (
        gammaln(shape + first)
        - gammaln(first + 1.0)
        - gammaln(shape)
        + betaln(exponent + shape, b + first)
        - betaln(exponent, b)
    )
    k = np.arange(first, first + terms - 1, dtype=np.float64)
    steps = (shape + k) * (b + k) / ((k + 1.0) * (exponent + shape + b + k))
    masses: Floats = np.exp(log_first) * np.concatenate(([1.0], np.cumprod(steps)))
    return masses
