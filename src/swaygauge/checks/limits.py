"""The limits a snapshot is judged by, and how they give way to what a network usually does."""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Annotated, Any, Final

import numpy as np
from annotated_types import Ge, Le

from swaygauge.records import Profile
from swaygauge.robust import robust_sd

Share = Annotated[float, Ge(0), Le(1)]
Count = Annotated[int, Ge(0)]

LOOSENED: Final = ("kept", "lost", "shrunk")  # facts whose repair limit follows the network's own spread


@dataclass(frozen=True)
class Limits:
    """Beyond a repair limit a night is scored but marked degraded; beyond a hold limit it is not scored.

    Defaults as measured on simulated crawls with planted faults and on real networks; a count of 0 sets no limit.
    """

    repair_kept: Share = 0.95  # at least: share of last night's links in effect seen again
    repair_lost: Share = 0.03  # at most: share of sources (>= 2 links) with none left
    repair_hub: Share = 0.05  # below: share of the 100 largest sources that lost more than half
    repair_cut: Annotated[int, Ge(1)] = 5  # below: sources cut to exactly the longest list of tonight
    repair_shrunk: Share = 0.03  # at most: share of sources (>= 5 links) that lost > 20 %, not all
    repair_unfetched: Share = 0.03  # at most: share of sources (>= 2 links) that the fetch list leaves out

    hold_kept: Share = 0.4  # at least: as repair_kept
    hold_lost: Share = 0.5  # at most: as repair_lost
    hold_nodes: Annotated[float, Ge(0)] = 0.5  # at least: nodes / trailing median
    hold_unfetched: Share = 0.5  # at most: as repair_unfetched

    note_nodes_low: Annotated[float, Ge(0)] = 0.95  # at least: nodes / trailing median; below it is mentioned
    note_nodes_high: Annotated[float, Ge(0)] = 1.05  # at most: nodes / trailing median; above it is mentioned

    step_kept: Share = 0.93  # with at least this share kept ...
    step_nodes: Annotated[float, Ge(1)] = 1.5  # ... more nodes / trailing median than this is a rise in coverage

    min_history: Annotated[int, Ge(1)] = 3  # accepted nights, below which limits stand as they are
    window: Annotated[int, Ge(1)] = 14  # fine nights that a repair limit may be loosened by
    spread: Annotated[float, Ge(0)] = 5.0  # robust standard deviations around their median
    loosest_kept: Share = 0.6  # repair_kept is never loosened past this
    loosest_lost: Share = 0.2  # repair_lost is never loosened past this
    loosest_shrunk: Share = 0.15  # repair_shrunk is never loosened past this

    agreement: Share = 0.9  # share of a held night's links seen again, from which the next one agrees with it
    agreeing_nights: Annotated[int, Ge(2)] = 3  # held nights in a row that agree: the last is the new baseline

    # the owner's own limits, hold, from the first night on
    min_links: Count = 0  # fewer links than this: hold; 0 = no limit
    max_links: Count = 0  # more links than this: hold; 0 = no limit
    min_nodes: Count = 0  # fewer nodes than this: hold; 0 = no limit
    max_nodes: Count = 0  # more nodes than this: hold; 0 = no limit
    max_duplicate_share: Share = 1.0  # of the rows read, rows that repeat a link; 1 = no limit
    max_dropped_share: Share = 0.05  # of the rows read, rows left out as unusable; common practice, no source
    max_new_node_share: Share = 1.0  # of tonight's nodes, never seen on an accepted night; 1 = no limit


def loosened(limits: Limits, fine_nights: Sequence[Profile]) -> Limits:
    """``limits`` with the repair limits of kept, lost and shrunk moved out to what fine nights show.

    To the median of the last ``window`` profiles of ``fine_nights`` (accepted as fine, oldest first) -+ ``spread``
    robust standard deviations, where that is looser, never past ``loosest_*``. Fewer than ``min_history`` such
    nights change nothing.

    >>> loosened(Limits(), []) == Limits()
    True
    """
    changed: dict[str, Any] = {}
    for fact in LOOSENED:
        values = [value for p in fine_nights[-limits.window :] if (value := getattr(p, fact)) is not None]
        if len(values) < limits.min_history:
            continue
        fixed = getattr(limits, f"repair_{fact}")
        loosest = getattr(limits, f"loosest_{fact}")
        middle, width = float(np.median(values)), limits.spread * robust_sd(values)
        if fact == "kept":
            changed["repair_kept"] = min(fixed, max(loosest, middle - width))
        else:
            changed[f"repair_{fact}"] = max(fixed, min(loosest, middle + width))
    return dataclasses.replace(limits, **changed)
