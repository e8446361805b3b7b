"""Kernels that turn a list of links into rows of in-links: a radix sort by (target, source), and merging repeats."""

from __future__ import annotations

import numpy as np

from swaygauge.kernels.compiled import compiled
from swaygauge.records import Floats, Ids, Ints

BATCH = 1024  # links looked up at a time
DIGIT = 11  # bits that one pass of the radix sort looks at


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
def deal(
    start: Ints,
    source: Ids,
    target: Ids,
    given: Floats,
    place: Ids,
    shift: int,
    bucket: Ints,
    packed: Ints,
    weight: Floats,
) -> None:
    """Links, as (target, source) packed in one number, into buckets of 2**shift targets.

    Source or target may be empty and is then the row that holds the link: rows begin at ``start`` (else not looked at).

    Nodes are renumbered by ``place`` unless it is empty. ``bucket`` is where each bucket's links begin, and is used up.
    Writing to a few hundred places at a time stays in the processor's caches; a million rows at once do not. Numbers
    are looked up for a batch at a time: one by one, every look-up would wait for the stores before it.
    """
    keys = np.empty(BATCH, np.int64)
    row = 0
    for low in range(0, len(packed), BATCH):
        size = min(BATCH, len(packed) - low)
        for i in range(size):
            if len(source) == 0 or len(target) == 0:
                while start[row + 1] <= low + i:
                    row += 1
            u = source[low + i] if len(source) > 0 else row
            v = target[low + i] if len(target) > 0 else row
            if len(place) > 0:
                u, v = place[u], place[v]
            keys[i] = (np.int64(v) << 32) | u
        for i in range(size):
            b = keys[i] >> (32 + shift)
            at = bucket[b]
            packed[at] = keys[i]
            if len(given) > 0:
                weight[at] = given[low + i]
            bucket[b] = at + 1


@compiled
def _sort_digit(
    keys: Ints, weight: Floats, first: int, size: int, spare: Ints, spare_weight: Floats, low_bit: int, back: bool
) -> None:
    """One stable pass of a radix sort: from keys[first:] to spare, or back."""
    counts = np.zeros((1 << DIGIT) + 1, np.int64)
    mask = (1 << DIGIT) - 1
    for i in range(size):
        key = spare[i] if back else keys[first + i]
        counts[((key >> low_bit) & mask) + 1] += 1
    for digit in range(mask + 1):
        counts[digit + 1] += counts[digit]
    for i in range(size):
        key = spare[i] if back else keys[first + i]
        digit = (key >> low_bit) & mask
        at = counts[digit]
        counts[digit] = at + 1
        if back:
            keys[first + at] = key
            if len(weight) > 0:
                weight[first + at] = spare_weight[i]
        else:
            spare[at] = key
            if len(weight) > 0:
                spare_weight[at] = weight[first + i]


@compiled
def sort_buckets(
    part: int,
    parts: int,
    cuts: Ints,
    bucket: Ints,
    packed: Ints,
    weight: Floats,
    source_bits: int,
    shift: int,
    column: Ids,
) -> None:
    """Sort the links of each bucket by (target, source) and write the sources out. Chunks are ranges of buckets."""
    for chunk in range(part, len(cuts) - 1, parts):
        for b in range(cuts[chunk], cuts[chunk + 1]):
            first, size = bucket[b], bucket[b + 1] - bucket[b]
            spare = np.empty(size, np.int64)
            spare_weight = np.empty(size if len(weight) > 0 else 0)
            back = False
            low_bit = 0
            while low_bit < 32 + shift:
                _sort_digit(packed, weight, first, size, spare, spare_weight, low_bit, back)
                back = not back
                low_bit += DIGIT
                if source_bits <= low_bit < 32:
                    low_bit = 32
            for i in range(size):
                column[first + i] = (spare[i] if back else packed[first + i]) & 0xFFFFFFFF
                if back and len(weight) > 0:
                    weight[first + i] = spare_weight[i]


@compiled
def _sum_ascending(weight: Floats, first: int, end: int) -> float:
    """Sum of a few entries from the smallest on; sorts them in place (by insertion: copies of one link are few)."""
    total = 0.0
    for i in range(first, end):
        value = weight[i]
        j = i
        while j > first and weight[j - 1] > value:
            weight[j] = weight[j - 1]
            j -= 1
        weight[j] = value
    for i in range(first, end):
        total += weight[i]
    return total


@compiled
def merge_repeats(start: Ints, column: Ids, weight: Floats) -> int:
    """Merge equal neighbours of ascending rows in place; returns how many links are left.

    Weights of one link are added from the smallest on, so their sum does not depend on the order they came in.
    """
    kept = 0
    first = start[0]
    for row in range(len(start) - 1):
        last = start[row + 1]
        while first < last:
            end = first + 1
            while end < last and column[end] == column[first]:
                end += 1
            column[kept] = column[first]
            if len(weight) > 0:
                weight[kept] = _sum_ascending(weight, first, end)
            kept += 1
            first = end
        start[row + 1] = kept
    return kept


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
