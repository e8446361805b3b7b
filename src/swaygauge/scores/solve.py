"""Solve z = h + gain * (row sums of z): one pass over what is acyclic, accelerated iteration inside strong components.

gain is alpha times a scale per row. Katz is alpha alone; fairshare keeps z = value / out-strength, so its scale is
1 / out-strength and links need no weights of their own; the adjoints are the same equation over the turned rows.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from swaygauge.errors import NotConverged
from swaygauge.graph import Rows
from swaygauge.kernels import sweeping
from swaygauge.kernels.threads import in_parts
from swaygauge.records import Floats
from swaygauge.scores.mixing import Mixer

QUICK_LINKS = 4_000  # components up to this size are solved on the spot, one row after the other
QUICK_SWEEPS = 40
MOST_SWEEPS = 5_000
PATIENCE = 40  # sweeps without progress after which only rounding can be in the way


@dataclass(frozen=True, eq=False)
class System:
    """The equation z = h + alpha * scale * (row sums of z)."""

    rows: Rows
    alpha: float
    scale: Floats  # (n,) by position, or of length 0 for a scale of 1


def solve(system: System, h: Floats, *, tolerance: float, start: Floats | None = None) -> tuple[Floats, int]:
    """z (n,) by position with |residual| <= tolerance * h or as small as rounding allows, and the most sweeps taken.

    Positions that are nobody's source are left out (their z is h). This is not yet proven: see :mod:`proof`. Raises
    NotConverged when the iteration diverges or does not settle.
    """
    z = h.copy() if start is None else start.copy()
    return z, carry_on(system, z, h, tolerance=tolerance, component=0)


def carry_on(system: System, z: Floats, h: Floats, *, tolerance: float, component: int) -> int:
    """Solve for the components from ``component`` on, in place; what is before stays as it is. Returns sweeps."""
    rows = system.rows
    end = int(np.searchsorted(rows.component_start, rows.sources))
    sweeps = 1
    while component < end:
        component = sweeping.walk(
            rows.start,
            rows.source,
            rows.weight,
            z,
            h,
            system.alpha,
            system.scale,
            rows.component_start,
            component,
            end,
            0.1 * tolerance,
            QUICK_LINKS,
            QUICK_SWEEPS,
        )
        if component < end:
            sweeps = max(sweeps, _settle(system, component, z, h, tolerance))
            component += 1
    return sweeps


def _settle(system: System, component: int, z: Floats, h: Floats, tolerance: float) -> int:
    """Accelerated fixed-point iteration inside one strong component."""
    rows, alpha, scale = system.rows, system.alpha, system.scale
    block = rows.block(component)
    low, cuts = block.low, block.cuts
    own = z[low : block.high]
    f = np.empty(len(own))
    in_parts(sweeping.sum_outside, cuts, rows.start, block.inner, rows.source, rows.weight, z, h, alpha, scale, low, f)
    unit = _unit_of(h[low : block.high], f)
    if unit is None:
        own[:] = 0.0
        return 1
    mixer = Mixer(len(own), len(cuts) - 1)
    least, since = np.inf, 0
    for sweep in range(1, MOST_SWEEPS + 1):
        slot = mixer.next_slot()
        in_parts(
            sweeping.map_and_compare,
            cuts,
            rows.start,
            block.inner,
            rows.source,
            rows.weight,
            own,
            f,
            unit,
            alpha,
            scale,
            low,
            mixer.mapped,
            mixer.error,
            slot,
            mixer.used,
            mixer.totals,
        )
        worst = mixer.take_in(slot)
        since = since + 1 if worst > 0.7 * least else 0
        least = min(least, worst)
        if worst <= tolerance or (since >= PATIENCE and _is_rounding(worst, mixer.mapped[slot], unit)):
            own[:] = mixer.mapped[slot]
            return sweep
        if not worst < 1e200:
            break
        in_parts(sweeping.combine, cuts, mixer.mapped, mixer.weights(slot), own)
    raise NotConverged(
        f"a strong component of {len(own)} nodes did not settle: residual {worst:.3g} after {sweep} sweeps, expected "
        f"at most {tolerance:.3g}. Use a smaller alpha (now {alpha:.12g}), or a larger tolerance."
    )


def _unit_of(h: Floats, f: Floats) -> Floats | None:
    """What errors are measured in: h, or where that is 0 somewhere f kept off 0; None when there is nothing to solve."""
    if float(h.min()) > 0.0:
        return h
    largest = float(f.max())
    return np.maximum(f, 1e-3 * largest) if largest > 0.0 else None


def _is_rounding(worst: float, mapped: Floats, unit: Floats) -> bool:
    """Whether an error is of the size that rounding alone makes."""
    return bool(worst <= 1e-14 * np.max(np.abs(mapped) / unit))
