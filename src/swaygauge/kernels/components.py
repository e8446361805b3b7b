"""Kernels for strong components and the order of rows that follows from them."""

from __future__ import annotations

from swaygauge.kernels.compiled import compiled
from swaygauge.records import Ids, Ints


@compiled
def strong_components(start: Ints, column: Ids, out_degree: Ids, label: Ids, stack: Ids, entered: Ids, at: Ints) -> int:
    """Label each row with its strong component, 0, 1, ... so that links only lead from lower to higher labels.

    Rows without in-links come first and rows that are in nobody's row (out_degree 0) last; neither needs a search.
    Rows hold in-links, so a component is complete, and numbered, after everything upstream of it. Iterative, one label
    array; Pearce 2016, "A space-efficient algorithm for finding strongly connected components", IPL 116. ``label``,
    ``stack``, ``entered`` and ``at`` are work space of n entries each. Returns the number of components.
    """
    n = len(start) - 1
    label[:] = 0
    index = 1  # next visiting number; finished components count down from n and stay above every visiting number
    finished = n
    for row in range(n):
        if start[row + 1] == start[row]:
            label[row] = finished
            finished -= 1
    depth = 0  # the path being walked grows from the front of ``stack``, open rows from its back
    open_rows = n
    for root in range(n):
        if label[root] != 0 or out_degree[root] == 0:
            continue
        stack[0] = root
        at[0] = start[root]
        entered[0] = index
        label[root] = index
        index += 1
        depth = 1
        while depth > 0:
            row = stack[depth - 1]
            i = at[depth - 1]
            last = start[row + 1]
            lowest = label[row]
            down = -1
            while i < last:
                other = column[i]
                seen = label[other]
                if seen == 0:
                    down = other
                    break
                if seen < lowest:
                    lowest = seen
                i += 1
            label[row] = lowest
            at[depth - 1] = i  # a row entered from here is looked at again afterwards, for its label
            if down >= 0:
                stack[depth] = down
                at[depth] = start[down]
                entered[depth] = index
                label[down] = index
                index += 1
                depth += 1
                continue
            depth -= 1
            if lowest == entered[depth]:
                index -= 1
                while open_rows < n and lowest <= label[stack[open_rows]]:
                    label[stack[open_rows]] = finished
                    open_rows += 1
                    index -= 1
                label[row] = finished
                finished -= 1
            else:
                open_rows -= 1
                stack[open_rows] = row
    for row in range(n):
        if label[row] == 0:
            label[row] = finished
            finished -= 1
        label[row] = n - label[row]
    return n - finished


@compiled
def sort_by_degree(degree: Ids, counts: Ints, order: Ids) -> None:
    """Rows by falling degree, equal degrees by number; ``counts`` is zeroed work space of max degree + 2 entries."""
    top = len(counts) - 2
    for row in range(len(degree)):
        counts[top - degree[row] + 1] += 1
    for i in range(len(counts) - 1):
        counts[i + 1] += counts[i]
    for row in range(len(degree)):
        key = top - degree[row]
        order[counts[key]] = row
        counts[key] += 1


@compiled
def gather_components(label: Ids, by_degree: Ids, start: Ints, order: Ids) -> None:
    """Rows of one component together, components by label, inside by the order given; start: (components + 1)."""
    start[:] = 0
    for row in range(len(label)):
        start[label[row] + 1] += 1
    for c in range(len(start) - 1):
        start[c + 1] += start[c]
    for i in range(len(by_degree)):
        row = by_degree[i]
        c = label[row]
        order[start[c]] = row
        start[c] += 1
    for c in range(len(start) - 1, 0, -1):
        start[c] = start[c - 1]
    start[0] = 0


@compiled
def inner_links(start: Ints, column: Ids, low: int, high: int, inner: Ints) -> None:
    """inner[i]: where in row low + i, of a component of rows low .. high - 1, the links from inside begin."""
    for row in range(low, high):
        a, b = start[row], start[row + 1]
        while a < b:
            middle = (a + b) // 2
            if column[middle] < low:
                a = middle + 1
            else:
                b = middle
        inner[row - low] = a
