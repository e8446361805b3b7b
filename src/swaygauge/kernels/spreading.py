"""Kernels on what lies upstream and downstream, and bounds on the radius of small components."""

from __future__ import annotations

import numpy as np

from swaygauge.kernels.compiled import compiled
from swaygauge.records import Flags, Floats, Ids, Ints


@compiled
def mark_downstream(start: Ints, source: Ids, component_start: Ints, mark: Flags) -> None:
    """Mark every position that a marked one reaches."""
    for c in range(len(component_start) - 1):
        low, high = component_start[c], component_start[c + 1]
        hit = False
        for row in range(low, high):
            hit = hit or mark[row]
            for i in range(start[row], start[row + 1]):
                hit = hit or mark[source[i]]
            if hit:
                break
        if hit:
            mark[low:high] = True


@compiled
def mark_upstream(start: Ints, source: Ids, component_start: Ints, mark: Flags) -> None:
    """Mark every position that reaches a marked one."""
    for c in range(len(component_start) - 2, -1, -1):
        low, high = component_start[c], component_start[c + 1]
        hit = False
        for row in range(low, high):
            hit = hit or mark[row]
        if hit:
            for row in range(low, high):
                mark[row] = True
                for i in range(start[row], start[row + 1]):
                    mark[source[i]] = True


@compiled
def last_in_line(start: Ints, source: Ids, component_start: Ints, chosen: Flags, last: Flags) -> None:
    """last[c]: component c is chosen and reaches no other chosen one."""
    n = len(start) - 1
    leads = np.zeros(n, np.bool_)  # leads to a chosen component
    for c in range(len(component_start) - 2, -1, -1):
        low, high = component_start[c], component_start[c + 1]
        hit = False
        for row in range(low, high):
            hit = hit or leads[row]
        last[c] = chosen[c] and not hit
        if hit or chosen[c]:
            for row in range(low, high):
                for i in range(start[row], start[row + 1]):
                    leads[source[i]] = True


@compiled
def bracket_small(
    start: Ints,
    source: Ids,
    weight: Floats,
    component_start: Ints,
    chosen: Ints,
    ceiling: Floats,
    best: float,
    gap: float,
    unit: float,
    most_links: int,
    most_sweeps: int,
    lower: Floats,
    upper: Floats,
) -> float:
    """Collatz-Wielandt brackets on the spectral radius of components, inner links only; returns the best lower bound.

    Component chosen[k] is left alone when its ceiling[k] is below the best lower bound, or when it is large.
    Any positive vector gives a proven bracket (Collatz 1942); power steps on (inner links + shift) narrow it until it
    is within ``gap``, or below the best lower bound, or ``most_sweeps`` have passed. ``unit`` widens for rounding.
    """
    for k in range(len(chosen)):
        if ceiling[k] < best:
            continue
        low, high = component_start[chosen[k]], component_start[chosen[k] + 1]
        if start[high] - start[low] > most_links:
            continue
        size = high - low
        v = np.ones(size)
        image = np.empty(size)
        shift = 0.0
        below, over = 0.0, ceiling[k]
        for _ in range(most_sweeps):
            least, most, top = np.inf, 0.0, 0.0
            for row in range(low, high):
                total = shift * v[row - low]
                for i in range(start[row], start[row + 1]):
                    if low <= source[i] < high:
                        total += v[source[i] - low] * (weight[i] if len(weight) > 0 else 1.0)
                image[row - low] = total
                quotient = total / v[row - low]
                least = min(least, quotient)
                most = max(most, quotient)
                top = max(top, total)
            slack = unit * (start[high] - start[low] + 8)
            below = max(below, least * (1.0 - slack) - shift)
            over = min(over, most * (1.0 + slack) - shift)
            best = max(best, below)
            if over - below <= gap * below or over < best:
                break
            shift = 0.5 * np.sqrt(below * over)
            for i in range(size):
                v[i] = max(image[i] / top, 1e-280)
        lower[k], upper[k] = below, over
    return best


@compiled
def log_cycle(start: Ints, source: Ids, weight: Floats, low: int, high: int, height: Floats) -> None:
    """Logarithm of the leading eigenvector of a component whose every row has exactly one inner link: a single cycle.

    Along it, radius * v[row] = weight * v[source], with the radius the geometric mean of the weights.
    """
    size = high - low
    mean = 0.0
    for pass_number in range(2):
        row = low
        for _ in range(size):
            for i in range(start[row], start[row + 1]):
                if source[i] >= low:
                    step = np.log(weight[i]) if len(weight) > 0 else 0.0
                    if pass_number == 0:
                        mean += step / size
                    elif source[i] != low:
                        height[source[i] - low] = height[row - low] + mean - step
                    row = source[i]
                    break
