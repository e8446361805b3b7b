"""Solve z = h + gain * (row sums of z): one pass over what is acyclic, accelerated iteration inside strong components.

gain is alpha times a scale per row. Katz is alpha alone; fairshare keeps z = value / out-strength, so its scale is
1 / out-strength and links need no weights of their own; the adjoints are the same equation over the turned rows.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from swaygauge.errors import NotConverged
from swaygauge.graph import Block, Rows
from swaygauge.kernels import sweeping
from swaygauge.kernels.threads import in_parts
from swaygauge.records import Floats
from swaygauge.scores.mixing import Mixer

QUICK_LINKS = 4_000  # components up to this size are solved on the spot, one row after the other
QUICK_SWEEPS = 120
MOST_SWEEPS = 5_000
PATIENCE = 40  # sweeps without progress after which only rounding can be in the way


@dataclass(frozen=True, eq=False)
class System:
    """The equation z = h + alpha * scale * (row sums of z)."""

    rows: Rows
    alpha: float
    scale: Floats  # (n,) by position, or of length 0 for a scale of 1


@dataclass(frozen=True, eq=False)
class Solved:
    """An approximate solution, not yet proven (see :mod:`proof`); arrays (n,) by position."""

    z: Floats  # positions that are nobody's source are left out
    image: Floats  # h + gain * (row sums of z) where iteration has worked it out, else NaN
    sweeps: int  # over the component that took most


def solve(system: System, h: Floats, *, tolerance: float, start: Floats | None = None) -> Solved:
    """Solve until |residual| <= tolerance * h, or as small as rounding allows.

    Raises NotConverged when the iteration diverges or does not settle.
    """
    z = h.copy() if start is None else start.copy()
    image = np.full(len(z), np.nan)
    return Solved(z, image, carry_on(system, z, h, tolerance=tolerance, image=image))


def carry_on(
    system: System,
    z: Floats,
    h: Floats,
    *,
    tolerance: float,
    component: int = 0,
    before: int | None = None,
    image: Floats | None = None,
) -> int:
    """Solve for the components from ``component`` on, in place, up to ``before``; the others stay. Returns sweeps.

    With ``image``, z stays one step behind on components that were iterated, and the step is written there.
    """
    rows = system.rows
    end = int(np.searchsorted(rows.component_start, rows.sources))
    end = end if before is None else min(end, before)
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
            block = rows.block(component)
            mapped, taken = _settle(system, block, z, h, tolerance)
            (z if image is None else image)[block.low : block.high] = mapped
            sweeps = max(sweeps, taken)
            component += 1
    return sweeps


def _settle(system: System, block: Block, z: Floats, h: Floats, tolerance: float) -> tuple[Floats, int]:
    """Accelerated fixed-point iteration inside one strong component: the last image of z, and the sweeps it took."""
    rows, alpha, scale = system.rows, system.alpha, system.scale
    low, cuts = block.low, block.cuts
    own = z[low : block.high]
    f = np.empty(len(own))
    in_parts(sweeping.sum_outside, cuts, rows.start, block.inner, rows.source, rows.weight, z, h, alpha, scale, low, f)
    unit = _unit_of(h[low : block.high], f)
    if unit is None:
        own[:] = 0.0
        return own, 1
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
            return mixer.mapped[slot], sweep
        if not worst < 1e200:
            break
        in_parts(sweeping.combine, cuts, mixer.mapped, mixer.weights(slot), own)
    raise NotConverged(
        f"a strong component of {len(own)} nodes did not settle: residual {worst:.3g} after {sweep} sweeps, expected "
        f"at most {tolerance:.3g}. Use a smaller alpha (now {alpha:.12g}), or a larger tolerance."
    )


def _unit_of(h: Floats, f: Floats) -> Floats | None:
    """What errors are measured in: h, or where that is 0 somewhere, f kept off 0; None when all is 0."""
    if float(h.min()) > 0.0:
        return h
    largest = float(f.max())
    return np.maximum(f, 1e-3 * largest) if largest > 0.0 else None


def _is_rounding(worst: float, mapped: Floats, unit: Floats) -> bool:
    """Whether an error is of the size that rounding alone makes."""
    return bool(worst <= 1e-14 * np.max(np.abs(mapped) / unit))
