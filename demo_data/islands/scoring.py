"""What an event did: both scores of a set of links, without any library, for the truth files.

x = beta + alpha W'x with beta = 1 by plain iteration: short, slow, and independent of the package it is used to check.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from islands.world import Flags, Floats, Ids, Keys

FAIRSHARE_ALPHA = 0.85
PIN_SHARE = 0.80  # katz alpha = this share of 1/lambda on the first night, then kept
MATERIAL = round(math.log2(1.5), 3)  # octaves from which an effect counts as material
PIN_LIMIT = 0.90  # ... until alpha * lambda exceeds this


@dataclass(frozen=True)
class Standing:
    """Values and places of one score; place 0 marks a node without any link."""

    value: Floats
    place: Ids


def spectral_radius(keys: Keys, capacity: int, weight: Ids | None = None) -> float:
    """lambda by power iteration on A + I (shifted, so that cycles do not make it swing)."""
    source, target = keys // capacity, keys % capacity
    worth = np.ones(len(keys)) if weight is None else weight.astype(float)
    x = np.ones(capacity)
    last = 0.0
    for _ in range(5000):
        y = x + np.bincount(target, worth * x[source], capacity)
        size = float(y.max())
        if abs(size - last) < 1e-10 * size:
            break
        last, x = size, y / size
    return last - 1.0


def standing(keys: Keys, capacity: int, score: str, *, alpha: float, weight: Ids | None = None) -> Standing:
    """``score`` is "katz" (every target gets the source's full value) or "fairshare" (split among its targets)."""
    source, target = keys // capacity, keys % capacity
    worth = np.ones(len(keys)) if weight is None else weight.astype(float)
    if score == "fairshare":
        worth = worth / np.bincount(source, worth, capacity)[source]
    x: Floats = np.ones(capacity)
    for _ in range(2000):
        y = 1.0 + alpha * np.bincount(target, worth * x[source], capacity)
        step = float(np.abs(y - x).max())
        x = y
        if step < 1e-11 * float(x.max()):
            break
    present = np.zeros(capacity, bool)
    present[source] = present[target] = True
    return Standing(value=x, place=places(x, present))


def places(value: Floats, present: Flags) -> Ids:
    """1 = the largest value; nodes within a billionth of each other share a place; 0 where not ``present``."""
    ordered = np.sort(value[present])
    place = np.zeros(len(value), np.int64)
    place[present] = 1 + len(ordered) - np.searchsorted(ordered, value[present] * (1 + 1e-9), side="right")
    return place


def octaves(before: int, after: int) -> float | None:
    """log2(place before / place after): +1 when the place number is halved; None when one side is missing."""
    return round(math.log2(before / after), 3) if before and after else None
