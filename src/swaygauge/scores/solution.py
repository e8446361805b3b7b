"""What a solve hands back."""

from __future__ import annotations

from dataclasses import dataclass

from swaygauge.records import Floats


@dataclass(frozen=True, eq=False)
class Solution:
    """Scores that carry their proof: |value - exact| <= bound for every node, rounding included."""

    value: Floats  # (n,) by node, in units of one node's own importance
    bound: Floats  # (n,) by node, > 0
    residual: float  # largest |beta + alpha W'x - x| / beta over nodes with beta > 0
    sweeps: int  # passes over the links of the component that took most, proof included
    alpha: float
