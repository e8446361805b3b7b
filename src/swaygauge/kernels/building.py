"""Kernels that turn a list of links into in-link rows, and reorder rows."""

from __future__ import annotations

import numpy as np

from swaygauge.kernels.compiled import compiled
from swaygauge.records import Floats, Ids, Ints

SHORT = 24  # rows up to this length are sorted by insertion


@compiled
def is_tidy(source: Ids, target: Ids) -> bool:
    """Whether links are in strictly ascending (target, source) order: sorted, and none repeated."""
    for i in range(1, len(source)):
        if target[i] < target[i - 1] or (target[i] == target[i - 1] and source[i] <= source[i - 1]):
            return False
    return True


@compiled
def count_rows(key: Ids, start: Ints) -> None:
    """start (rows + 1): where each row begins when links are grouped by ``key``."""
    start[:] = 0
    for i in range(len(key)):
        start[key[i] + 1] += 1
    for row in range(len(start) - 1):
        start[row + 1] += start[row]


@compiled
def place_links(key: Ids, other: Ids, given: Floats, start: Ints, column: Ids, weight: Floats) -> None:
    """Counting sort: put each link's other end (and weight) into the row of its key, in the order given."""
    weighted = len(given) > 0
    for i in range(len(key)):
        row = key[i]
        at = start[row]
        column[at] = other[i]
        if weighted:
            weight[at] = given[i]
        start[row] = at + 1
    for row in range(len(start) - 1, 0, -1):  # the cursors stand one row ahead now
        start[row] = start[row - 1]
    start[0] = 0


@compiled
def _less(column: Ids, weight: Floats, i: int, j: int) -> bool:
    if column[i] != column[j]:
        return bool(column[i] < column[j])
    return bool(len(weight) > 0 and weight[i] < weight[j])


@compiled
def _swap(column: Ids, weight: Floats, i: int, j: int) -> None:
    column[i], column[j] = column[j], column[i]
    if len(weight) > 0:
        weight[i], weight[j] = weight[j], weight[i]


@compiled
def _sift(column: Ids, weight: Floats, low: int, root: int, size: int) -> None:
    while 2 * root + 1 < size:
        child = 2 * root + 1
        if child + 1 < size and _less(column, weight, low + child, low + child + 1):
            child += 1
        if not _less(column, weight, low + root, low + child):
            return
        _swap(column, weight, low + root, low + child)
        root = child


@compiled
def _heap_sort(column: Ids, weight: Floats, low: int, high: int) -> None:
    size = high - low
    for root in range(size // 2 - 1, -1, -1):
        _sift(column, weight, low, root, size)
    for last in range(size - 1, 0, -1):
        _swap(column, weight, low, low + last)
        _sift(column, weight, low, 0, last)


@compiled
def _insertion_sort(column: Ids, weight: Floats, low: int, high: int) -> None:
    for i in range(low + 1, high):
        j = i
        while j > low and _less(column, weight, j, j - 1):
            _swap(column, weight, j, j - 1)
            j -= 1


@compiled
def _sort_row(column: Ids, weight: Floats, first: int, last: int, stack: Ints) -> None:
    """Ascending by (column, weight): quicksort on an explicit stack, heapsort where it would go deep."""
    i = first + 1
    while i < last and not _less(column, weight, i, i - 1):
        i += 1
    if i >= last:
        return
    stack[0], stack[1], stack[2] = first, last, 0
    top = 1
    while top > 0:
        top -= 1
        low, high, depth = stack[3 * top], stack[3 * top + 1], stack[3 * top + 2]
        if high - low <= SHORT:
            _insertion_sort(column, weight, low, high)
            continue
        if depth > 60 or top > 60:
            _heap_sort(column, weight, low, high)
            continue
        middle = (low + high) // 2  # median of three to the front as the pivot
        if _less(column, weight, middle, low):
            _swap(column, weight, middle, low)
        if _less(column, weight, high - 1, middle):
            _swap(column, weight, high - 1, middle)
            if _less(column, weight, middle, low):
                _swap(column, weight, middle, low)
        _swap(column, weight, low, middle)
        left, right = low, high
        while True:
            left += 1
            while left < high and _less(column, weight, left, low):
                left += 1
            right -= 1
            while _less(column, weight, low, right):
                right -= 1
            if left >= right:
                break
            _swap(column, weight, left, right)
        _swap(column, weight, low, right)
        stack[3 * top], stack[3 * top + 1], stack[3 * top + 2] = low, right, depth + 1
        top += 1
        stack[3 * top], stack[3 * top + 1], stack[3 * top + 2] = right + 1, high, depth + 1
        top += 1


@compiled
def sort_rows(part: int, parts: int, cuts: Ints, start: Ints, column: Ids, weight: Floats, repeats: Ints) -> None:
    """Sort each row by (column, weight); ``repeats[chunk]`` counts links equal to the one before."""
    stack = np.empty(200, np.int64)
    for chunk in range(part, len(cuts) - 1, parts):
        found = 0
        for row in range(cuts[chunk], cuts[chunk + 1]):
            _sort_row(column, weight, start[row], start[row + 1], stack)
            for i in range(start[row] + 1, start[row + 1]):
                if column[i] == column[i - 1]:
                    found += 1
        repeats[chunk] = found


@compiled
def merge_repeats(start: Ints, column: Ids, weight: Floats) -> int:
    """Merge equal neighbours of sorted rows in place, weights added; returns how many links are left."""
    kept = 0
    first = start[0]
    for row in range(len(start) - 1):
        last = start[row + 1]
        begin = kept
        for i in range(first, last):
            if kept > begin and column[kept - 1] == column[i]:
                if len(weight) > 0:
                    weight[kept - 1] += weight[i]
                continue
            column[kept] = column[i]
            if len(weight) > 0:
                weight[kept] = weight[i]
            kept += 1
        start[row + 1] = kept
        first = last
    return kept


@compiled
def move_rows(
    part: int,
    parts: int,
    cuts: Ints,
    start: Ints,
    column: Ids,
    weight: Floats,
    order: Ids,
    place: Ids,
    new_start: Ints,
    new_column: Ids,
    new_weight: Floats,
) -> None:
    """Row i of the result is row order[i], its columns renumbered by ``place`` and sorted again."""
    stack = np.empty(200, np.int64)
    for chunk in range(part, len(cuts) - 1, parts):
        for row in range(cuts[chunk], cuts[chunk + 1]):
            at = new_start[row]
            old = order[row]
            for i in range(start[old], start[old + 1]):
                new_column[at] = place[column[i]]
                if len(weight) > 0:
                    new_weight[at] = weight[i]
                at += 1
            _sort_row(new_column, new_weight, new_start[row], at, stack)


@compiled
def turn_rows(start: Ints, column: Ids, weight: Floats, new_start: Ints, new_column: Ids, new_weight: Floats) -> None:
    """The reversed links, with row and column numbers counted from the end so that what was last comes first."""
    n = len(start) - 1
    new_start[:] = 0
    for i in range(len(column)):
        new_start[n - column[i]] += 1
    for row in range(n):
        new_start[row + 1] += new_start[row]
    for row in range(n - 1, -1, -1):
        for i in range(start[row], start[row + 1]):
            key = n - 1 - column[i]
            at = new_start[key]
            new_column[at] = n - 1 - row
            if len(weight) > 0:
                new_weight[at] = weight[i]
            new_start[key] = at + 1
    for row in range(n, 0, -1):
        new_start[row] = new_start[row - 1]
    new_start[0] = 0


@compiled
def add_out_strength(start: Ints, column: Ids, weight: Floats, total: Floats, carry: Floats) -> None:
    """total[j] + carry[j] = sum of the weights of column j over all rows, compensated (Neumaier 1974)."""
    for row in range(len(start) - 1):
        for i in range(start[row], start[row + 1]):
            j = column[i]
            value = weight[i]
            before = total[j]
            after = before + value
            if before >= value:
                carry[j] += (before - after) + value
            else:
                carry[j] += (value - after) + before
            total[j] = after
