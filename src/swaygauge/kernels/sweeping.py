"""Kernels that pass over rows of in-links: z = h + gain * (sum over the row's links of weight * z).

gain is alpha, times ``scale[row]`` where there is a scale. The vectors of one strong component start at row ``low``.
"""

from __future__ import annotations

import numpy as np

from swaygauge.kernels.compiled import compiled
from swaygauge.records import Floats, Ids, Ints

TINY = 1e-280  # keeps a miss above 0 where everything is exactly 0
ALWAYS_ELIMINATED = 12  # nodes of a component that is solved by elimination at once
MOST_ELIMINATED = 64  # nodes of a component that is solved by elimination when sweeps are slow
BLOCK = 64  # links summed plainly in four lanes; the sums of blocks are added with compensation


@compiled
def _row_sum(source: Ids, weight: Floats, first: int, last: int, z: Floats, low: int) -> float:
    """Sum of weight * z[source - low] over links first .. last - 1.

    Relative error at most 25 units of rounding for terms of one sign, however long the row: a block of 64 adds each
    term at most 16 + 2 + 3 times after one product, and Neumaier's compensation adds 2.
    """
    total = 0.0
    carry = 0.0
    weighted = len(weight) > 0
    while first < last:
        stop = min(first + BLOCK, last)
        a = b = c = d = 0.0
        i = first
        if weighted:
            while i + 4 <= stop:
                a += weight[i] * z[source[i] - low]
                b += weight[i + 1] * z[source[i + 1] - low]
                c += weight[i + 2] * z[source[i + 2] - low]
                d += weight[i + 3] * z[source[i + 3] - low]
                i += 4
            part = (a + b) + (c + d)
            while i < stop:
                part += weight[i] * z[source[i] - low]
                i += 1
        else:
            while i + 4 <= stop:
                a += z[source[i] - low]
                b += z[source[i + 1] - low]
                c += z[source[i + 2] - low]
                d += z[source[i + 3] - low]
                i += 4
            part = (a + b) + (c + d)
            while i < stop:
                part += z[source[i] - low]
                i += 1
        after = total + part
        if abs(total) >= abs(part):
            carry += (total - after) + part
        else:
            carry += (part - after) + total
        total = after
        first = stop
    return total + carry


@compiled
def _eliminate(
    start: Ints, source: Ids, weight: Floats, z: Floats, h: Floats, alpha: float, scale: Floats, low: int, high: int
) -> None:
    """Solve one small component by elimination, without pivoting: stable for the matrices that a legal alpha makes."""
    size = high - low
    matrix = np.zeros((size, size))
    right = np.empty(size)
    for i in range(size):
        row = low + i
        gain = alpha * scale[row] if len(scale) > 0 else alpha
        first = start[row]
        last = start[row + 1]
        while first < last and source[first] < low:
            first += 1
        right[i] = h[row] + gain * _row_sum(source, weight, start[row], first, z, 0)
        for j in range(first, last):
            matrix[i, source[j] - low] -= gain * (weight[j] if len(weight) > 0 else 1.0)
        matrix[i, i] += 1.0
    for i in range(size):
        for k in range(i + 1, size):
            if matrix[k, i] != 0.0:
                factor = matrix[k, i] / matrix[i, i]
                for j in range(i + 1, size):
                    matrix[k, j] -= factor * matrix[i, j]
                right[k] -= factor * right[i]
    for i in range(size - 1, -1, -1):
        for j in range(i + 1, size):
            right[i] -= matrix[i, j] * right[j]
        right[i] /= matrix[i, i]
        z[low + i] = right[i]


@compiled
def walk(
    start: Ints,
    source: Ids,
    weight: Floats,
    z: Floats,
    h: Floats,
    alpha: float,
    scale: Floats,
    component_start: Ints,
    component: int,
    end: int,
    tolerance: float,
    most_links: int,
    most_sweeps: int,
) -> int:
    """Solve components in their order, upstream first, as long as each is quick to solve on the spot.

    A single row takes one evaluation, a handful of rows elimination; a small component a few Gauss-Seidel sweeps, until
    no row changes by more than ``tolerance`` h or by rounding, or elimination when that is slow. Returns the first
    component that is too large or too slow for that, or ``end``.
    """
    while component < end:
        low, high = component_start[component], component_start[component + 1]
        if high - low == 1:
            first, last = start[low], start[low + 1]
            gain = alpha * scale[low] if len(scale) > 0 else alpha
            loop = 0.0
            if last > first and source[last - 1] == low:
                last -= 1
                loop = gain * (weight[last] if len(weight) > 0 else 1.0)
            z[low] = (h[low] + gain * _row_sum(source, weight, first, last, z, 0)) / (1.0 - loop)
            component += 1
            continue
        if start[high] - start[low] > most_links:
            return component
        if high - low <= ALWAYS_ELIMINATED:
            _eliminate(start, source, weight, z, h, alpha, scale, low, high)
            component += 1
            continue
        settled = False
        for _ in range(most_sweeps):
            settled = True
            for row in range(low, high):
                gain = alpha * scale[row] if len(scale) > 0 else alpha
                value = h[row] + gain * _row_sum(source, weight, start[row], start[row + 1], z, 0)
                change = abs(value - z[row])
                if not change <= max(tolerance * h[row], 1e-15 * abs(value)):
                    settled = False
                z[row] = value
            if settled:
                break
        if not settled:
            if high - low > MOST_ELIMINATED:
                return component
            _eliminate(start, source, weight, z, h, alpha, scale, low, high)
        component += 1
    return component


@compiled
def sum_outside(
    part: int,
    parts: int,
    cuts: Ints,
    start: Ints,
    inner: Ints,
    source: Ids,
    weight: Floats,
    z: Floats,
    h: Floats,
    alpha: float,
    scale: Floats,
    low: int,
    f: Floats,
) -> None:
    """f = h + gain * (sum over links from outside the component)."""
    for chunk in range(part, len(cuts) - 1, parts):
        for i in range(cuts[chunk], cuts[chunk + 1]):
            gain = alpha * scale[low + i] if len(scale) > 0 else alpha
            f[i] = h[low + i] + gain * _row_sum(source, weight, start[low + i], inner[i], z, 0)


@compiled
def map_and_compare(
    part: int,
    parts: int,
    cuts: Ints,
    start: Ints,
    inner: Ints,
    source: Ids,
    weight: Floats,
    z: Floats,
    f: Floats,
    unit: Floats,
    alpha: float,
    scale: Floats,
    low: int,
    mapped: Floats,
    error: Floats,
    slot: int,
    used: int,
    totals: Floats,
) -> None:
    """One application of the map to z (the component's own rows), and how far it moved.

    mapped[slot] = f + gain * inner sums; error[slot] = (mapped[slot] - z) / unit; per chunk, totals[chunk, j] = the
    product of error[slot] with error[j] for j < used, and totals[chunk, -1] = the largest |error[slot]|.
    """
    for chunk in range(part, len(cuts) - 1, parts):
        a, b = cuts[chunk], cuts[chunk + 1]
        largest = 0.0
        for i in range(a, b):
            gain = alpha * scale[low + i] if len(scale) > 0 else alpha
            value = f[i] + gain * _row_sum(source, weight, inner[i], start[low + i + 1], z, low)
            q = (value - z[i]) / unit[i]
            mapped[slot, i] = value
            error[slot, i] = q
            if not abs(q) <= largest:
                largest = abs(q)
        for j in range(used):
            p0 = p1 = p2 = p3 = 0.0
            i = a
            while i + 4 <= b:
                p0 += error[slot, i] * error[j, i]
                p1 += error[slot, i + 1] * error[j, i + 1]
                p2 += error[slot, i + 2] * error[j, i + 2]
                p3 += error[slot, i + 3] * error[j, i + 3]
                i += 4
            while i < b:
                p0 += error[slot, i] * error[j, i]
                i += 1
            totals[chunk, j] = (p0 + p1) + (p2 + p3)
        totals[chunk, totals.shape[1] - 1] = largest


@compiled
def combine(part: int, parts: int, cuts: Ints, mapped: Floats, theta: Floats, z: Floats) -> None:
    """z = sum over j of theta[j] * mapped[j]."""
    for chunk in range(part, len(cuts) - 1, parts):
        a, b = cuts[chunk], cuts[chunk + 1]
        for i in range(a, b):
            z[i] = theta[0] * mapped[0, i]
        for j in range(1, len(theta)):
            if theta[j] != 0.0:
                for i in range(a, b):
                    z[i] += theta[j] * mapped[j, i]


@compiled
def publish(
    part: int,
    parts: int,
    cuts: Ints,
    start: Ints,
    source: Ids,
    weight: Floats,
    z: Floats,
    image: Floats,
    beta: Floats,
    alpha: float,
    strength: Floats,
    sources: int,
    unit: float,
    x: Floats,
    miss: Floats,
    totals: Floats,
) -> None:
    """x = beta + alpha * (row sum of z), and ``miss`` = how far z is from reproducing itself, rounding included.

    z stands for the values z * strength (z itself without strength). Where ``image`` is not NaN it is what z leads to,
    in the terms of z, and the row is not summed again. A row that is nobody's source (from ``sources`` on, or of
    strength 0) stands for x itself. Per chunk: totals = the largest miss / (beta - |x - value|), the largest
    |x - value| / beta, the smallest z of a source.
    """
    for chunk in range(part, len(cuts) - 1, parts):
        ratio = 0.0
        residual = 0.0
        smallest = np.inf
        for i in range(cuts[chunk], cuts[chunk + 1]):
            new = image[i] * strength[i] if len(strength) > 0 else image[i]
            if np.isnan(new):
                new = beta[i] + alpha * _row_sum(source, weight, start[i], start[i + 1], z, 0)
            value = new
            if i < sources and (len(strength) == 0 or strength[i] > 0.0):
                value = z[i] * strength[i] if len(strength) > 0 else z[i]
                if not z[i] >= smallest:
                    smallest = z[i]
            gap = abs(new - value)
            x[i] = new
            miss[i] = gap + unit * (abs(new) + abs(value)) + TINY
            slack = beta[i] - gap
            if not slack > 0.0:
                ratio = np.inf
            elif miss[i] > ratio * slack:
                ratio = miss[i] / slack
            if gap > residual * beta[i]:
                residual = gap / beta[i]
        totals[chunk, 0] = ratio
        totals[chunk, 1] = residual
        totals[chunk, 2] = smallest


@compiled
def check_above(
    part: int,
    parts: int,
    cuts: Ints,
    start: Ints,
    source: Ids,
    weight: Floats,
    y: Floats,
    image: Floats,
    miss: Floats,
    alpha: float,
    strength: Floats,
    sources: int,
    unit: float,
    above: Floats,
    totals: Floats,
) -> None:
    """above = miss + alpha * (row sum of y), rounded up; ``image`` as in :func:`publish`.

    Per chunk, over sources: totals = the largest (above - value of y) / miss, the smallest y.
    """
    for chunk in range(part, len(cuts) - 1, parts):
        largest = -np.inf
        smallest = np.inf
        for i in range(cuts[chunk], cuts[chunk + 1]):
            high = image[i] * strength[i] if len(strength) > 0 else image[i]
            if np.isnan(high):
                high = miss[i] + alpha * _row_sum(source, weight, start[i], start[i + 1], y, 0)
            high *= 1.0 + unit
            above[i] = high
            if i < sources and (len(strength) == 0 or strength[i] > 0.0):
                value = y[i] * strength[i] if len(strength) > 0 else y[i]
                excess = (high - value * (1.0 - unit)) / miss[i]
                if not excess <= largest:
                    largest = excess
                if not y[i] >= smallest:
                    smallest = y[i]
        totals[chunk, 0] = largest
        totals[chunk, 1] = smallest


@compiled
def power(
    part: int,
    parts: int,
    cuts: Ints,
    start: Ints,
    inner: Ints,
    source: Ids,
    weight: Floats,
    v: Floats,
    low: int,
    shift: float,
    image: Floats,
    totals: Floats,
) -> None:
    """image = (inner links + shift) v. Per chunk: smallest and largest image / v, largest |image|, smallest v."""
    for chunk in range(part, len(cuts) - 1, parts):
        least, most, top, floor = np.inf, 0.0, 0.0, np.inf
        for i in range(cuts[chunk], cuts[chunk + 1]):
            value = shift * v[i] + _row_sum(source, weight, inner[i], start[low + i + 1], v, low)
            image[i] = value
            quotient = value / v[i]
            if not quotient >= least:
                least = quotient
            if not quotient <= most:
                most = quotient
            if abs(value) > top:
                top = abs(value)
            if not v[i] >= floor:
                floor = v[i]
        totals[chunk, 0], totals[chunk, 1], totals[chunk, 2], totals[chunk, 3] = least, most, top, floor


@compiled
def project(part: int, parts: int, cuts: Ints, basis: Floats, used: int, vector: Floats, totals: Floats) -> None:
    """Per chunk, the products of ``vector`` with basis[j] for j < used, and with itself (in totals[chunk, used])."""
    for chunk in range(part, len(cuts) - 1, parts):
        a, b = cuts[chunk], cuts[chunk + 1]
        for j in range(used + 1):
            p0 = p1 = p2 = p3 = 0.0
            other = basis[j] if j < used else vector
            i = a
            while i + 4 <= b:
                p0 += vector[i] * other[i]
                p1 += vector[i + 1] * other[i + 1]
                p2 += vector[i + 2] * other[i + 2]
                p3 += vector[i + 3] * other[i + 3]
                i += 4
            while i < b:
                p0 += vector[i] * other[i]
                i += 1
            totals[chunk, j] = (p0 + p1) + (p2 + p3)


@compiled
def add_up(part: int, parts: int, cuts: Ints, basis: Floats, factor: Floats, vector: Floats) -> None:
    """vector += sum over j of factor[j] * basis[j]."""
    for chunk in range(part, len(cuts) - 1, parts):
        a, b = cuts[chunk], cuts[chunk + 1]
        for j in range(len(factor)):
            for i in range(a, b):
                vector[i] += factor[j] * basis[j, i]


@compiled
def rotate(part: int, parts: int, cuts: Ints, basis: Floats, rotation: Floats) -> None:
    """The first rotation.shape[1] vectors of basis become combinations of its first rotation.shape[0], in place."""
    used, kept = rotation.shape
    old = np.empty(used)
    for chunk in range(part, len(cuts) - 1, parts):
        for i in range(cuts[chunk], cuts[chunk + 1]):
            for j in range(used):
                old[j] = basis[j, i]
            for k in range(kept):
                total = 0.0
                for j in range(used):
                    total += old[j] * rotation[j, k]
                basis[k, i] = total
