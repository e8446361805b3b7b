"""Turn an approximate solution into values with proven componentwise error bounds.

With K = alpha * (links, scaled), values x and miss_i >= |(beta + K x - x)_i| (rounding included):

* if miss < beta everywhere and x >= 0 then K x < x, so the spectral radius of K is below 1: alpha is legal, whatever
  the network, without any eigenvalue (the M-matrix criterion; Berman, Plemmons 1994, ch. 6);
* then (I - K)^-1 is non-negative, so any y with y - K y >= miss has y >= |x - exact| in every component, and
  miss <= ratio * (beta - |residual|) gives |x - exact| <= ratio * x.

The first bound costs the one sweep that publishes the values. The second is tighter: y comes from a loose solve for
``miss`` and is checked, not trusted, by one more sweep. ROUNDING covers one row: 25 units for the sum (see
kernels/sweeping.py), products and additions, the stored out-strength and its quotient, the formation of the bound.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from swaygauge.errors import NotConverged
from swaygauge.kernels import sweeping
from swaygauge.kernels.threads import in_parts
from swaygauge.records import Floats
from swaygauge.scores.solve import Solved, System, solve

ROUNDING = 48 * 2.0**-53
LOOSE = 0.4  # how well the bound itself is solved for, relative to the miss: it is at most 1 / (1 - .4) too wide


@dataclass(frozen=True, eq=False)
class Proof:
    """Values by position with |x - exact| <= bound; ``slack`` > 0 everywhere proves that alpha is legal."""

    x: Floats
    bound: Floats
    slack: Floats  # beta - miss, rounded down
    residual: float
    sweeps: int


def prove(
    system: System,
    solved: Solved,
    beta: Floats,
    strength: Floats,
    *,
    legal: Callable[[], bool],
    yardstick: Proof | None = None,
) -> Proof:
    """The values that an approximate solution leads to, with their bounds.

    strength (n,) is the out-strength by position, or of length 0 where z are the values themselves. Where beta is 0
    somewhere, ``yardstick`` is the proof for a beta > 0 on the same network. ``legal`` is asked for another proof that
    the radius of K is below 1 when values are so large that rounding exceeds beta. Raises NotConverged when z proves
    nothing.
    """
    rows = system.rows
    x, miss = np.empty(rows.n), np.empty(rows.n)
    totals = np.zeros((len(rows.cuts) - 1, 3))
    in_parts(
        sweeping.publish,
        rows.cuts,
        rows.start,
        rows.source,
        rows.weight,
        solved.z,
        solved.image,
        beta,
        system.alpha,
        strength,
        rows.sources,
        ROUNDING,
        x,
        miss,
        totals,
    )
    ratio, residual, smallest = float(totals[:, 0].max()), float(totals[:, 1].max()), float(totals[:, 2].min())
    if yardstick is not None:
        ratio = float(np.max(miss / yardstick.slack)) if bool((yardstick.slack > 0.0).all()) else np.inf
    by_itself = ratio < 1.0 and smallest >= 0.0 and bool(np.isfinite(x).all())
    closer, more = None, 0
    if by_itself or (smallest >= 0.0 and bool(np.isfinite(miss).all()) and legal()):
        closer, more = _closer_bound(system, miss, strength)
    if by_itself:
        bound = miss + ratio * (1.0 + 4 * ROUNDING) * (x if yardstick is None else yardstick.x)
        if closer is not None:
            np.minimum(bound, closer, out=bound)
    elif closer is not None:
        bound = closer
    else:
        raise NotConverged(
            f"the values could not be proven (residual / beta = {residual:.3g}, smallest value {smallest:.3g}, "
            f"alpha = {system.alpha:.12g}). Use a smaller alpha or a smaller tolerance."
        )
    return Proof(x, bound, (beta - miss) * (1.0 - ROUNDING), residual, solved.sweeps + 1 + more)


def _closer_bound(system: System, miss: Floats, strength: Floats) -> tuple[Floats | None, int]:
    """A checked upper bound on (I - K)^-1 miss, or None when the loose solve gave none; and its sweeps."""
    rows = system.rows
    h = miss * system.scale if len(system.scale) else miss
    try:
        loose = solve(system, h, tolerance=LOOSE)
    except NotConverged:
        return None, 0
    above = np.empty(rows.n)
    totals = np.zeros((len(rows.cuts) - 1, 2))
    in_parts(
        sweeping.check_above,
        rows.cuts,
        rows.start,
        rows.source,
        rows.weight,
        loose.z,
        loose.image,
        miss,
        system.alpha,
        strength,
        rows.sources,
        ROUNDING,
        above,
        totals,
    )
    excess, smallest = float(totals[:, 0].max()), float(totals[:, 1].min())
    if not (excess < 0.9 and smallest >= 0.0):
        return None, loose.sweeps + 1
    above *= (1.0 + 4 * ROUNDING) / (1.0 - max(excess, 0.0))
    return above, loose.sweeps + 1
