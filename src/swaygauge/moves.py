"""Two nights' scores: how every node's rank moved, and how the top as a whole changed."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy.stats import kendalltau

from swaygauge.errors import ScoreError
from swaygauge.records import ARRIVED, DEPARTED, MOVED, Floats, Ids, Ints, Moves, NetworkMove, ScoreSet, frozen

TOP_BAND_OCTAVES: Final = 4  # ranks 1 to 15 are one depth band: single octaves up there hold 1, 2, 4 and 8 nodes


def depth_band(rank: Ids) -> Ids:
    """The depth band of each rank (k,): 0 for ranks 1-15, then one band per octave (1 for 16-31, 2 for 32-63, ...).

    >>> depth_band(np.array([1, 15, 16, 31, 32, 1000], np.int32)).tolist()
    [0, 0, 1, 1, 2, 6]
    """
    octave = np.frexp(np.maximum(rank, 1).astype(np.float64))[1]  # exact: 2**(octave-1) <= rank < 2**octave
    band: Ids = np.maximum(octave - TOP_BAND_OCTAVES, 0).astype(np.int32)
    return band


def compare_scores(before: ScoreSet, now: ScoreSet) -> Moves:
    """How each node present on either night moved between two nights of one score.

    ``octaves`` is log2(rank before / rank now): +1 means the rank number halved, the same at place 40 as at 4,000. A
    node that leaves a block of ties is measured from the block's first place. ``deviation`` is the log of the value
    ratio minus the median of the nodes that stood in the same depth band before, so a change common to all cancels.

    Raises ScoreError when the two sets are not like with like (another score, or another alpha).
    """
    if before.score != now.score:
        raise ScoreError(f"cannot compare score {before.score!r} with {now.score!r}; compare a score with itself.")
    if before.alpha != now.alpha:
        raise ScoreError(
            f"{now.score}: the scores of {before.night} were made with alpha = {before.alpha:.12g}, those of "
            f"{now.night} with {now.alpha:.12g}; score {before.night} again with the latter and compare with that."
        )
    ids = _merged(before.ids, now.ids)
    value_before, rank_before = _spread(ids, before)
    value_now, rank_now = _spread(ids, now)
    status = np.full(len(ids), MOVED, np.uint8)
    status[rank_before == 0] = ARRIVED
    status[rank_now == 0] = DEPARTED
    both = status == MOVED
    octaves = np.full(len(ids), np.nan)
    octaves[both] = np.log2(rank_before[both] / rank_now[both])
    deviation = np.full(len(ids), np.nan)
    growth = np.log(value_now[both] / value_before[both])
    deviation[both] = growth - _medians(growth, depth_band(rank_before[both]))
    return Moves(
        night=now.night,
        previous=before.night,
        score=now.score,
        ids=frozen(ids),
        status=frozen(status),
        value_before=frozen(value_before),
        value_now=frozen(value_now),
        rank_before=frozen(rank_before),
        rank_now=frozen(rank_now),
        octaves=frozen(octaves),
        deviation=frozen(deviation),
    )


def value_ratio(moves: Moves) -> Floats:
    """(k,) value now / value before; NaN when one side is missing."""
    ratio: Floats = moves.value_now / moves.value_before
    return ratio


def entered_left_top(moves: Moves, k: int) -> tuple[Ids, Ids]:
    """Sorted ids that entered and that left the first ``k`` places; arrivals and departures count."""
    was = (moves.rank_before > 0) & (moves.rank_before <= k)
    is_now = (moves.rank_now > 0) & (moves.rank_now <= k)
    return moves.ids[is_now & ~was], moves.ids[was & ~is_now]


def network_move(
    before: ScoreSet, now: ScoreSet, *, depth: int, gap_nights: int = 0, persistence: float = 0.9
) -> NetworkMove:
    """How the first ``depth`` places changed as a whole.

    A top is every node with rank <= depth, so a block of ties at the edge belongs to it as a whole. ``tau_b`` is None
    when fewer than two nodes are in both tops or all of them are tied on one night: there is no order to compare.
    """
    was, is_now = before.rank <= depth, now.rank <= depth
    in_both, at_before, at_now = np.intersect1d(
        before.ids[was], now.ids[is_now], assume_unique=True, return_indices=True
    )
    common_before, common_now = before.rank[was][at_before], now.rank[is_now][at_now]
    entered = int(is_now.sum()) - len(in_both)
    return NetworkMove(
        score=now.score,
        depth=depth,
        tau_b=kendall_tau_b(common_before, common_now),
        overlap=rank_biased_overlap(
            before.rank, now.rank, common_before, common_now, depth=depth, persistence=persistence
        ),
        turnover=entered / max(int(is_now.sum()), 1),
        gap_nights=gap_nights,
        footrule=top_footrule(before.rank[was], now.rank[is_now], common_before, common_now, depth=depth),
    )


def kendall_tau_b(before: NDArray[np.integer], now: NDArray[np.integer]) -> float | None:
    """Kendall's tau-b (ties corrected) of two rankings of the same nodes; None when one of them has no order.

    >>> round(kendall_tau_b(np.array([12, 2, 1, 12, 2]), np.array([1, 4, 7, 1, 0])), 12)  # SciPy's documentation
    -0.471404520791
    """
    if len(before) < 2 or np.ptp(before) == 0 or np.ptp(now) == 0:
        return None
    return float(kendalltau(before, now, variant="b").statistic)


def rank_biased_overlap(
    before: Ids, now: Ids, common_before: Ids, common_now: Ids, *, depth: int, persistence: float = 0.9
) -> float:
    """Rank-biased overlap of two rankings, extrapolated from their first ``depth`` places; in [0, 1], 1 = the same.

    before, now: competition ranks of all nodes of either night. common_before, common_now: the ranks of the nodes
    present on both nights, in one order (nodes beyond ``depth`` may be left out). persistence: the weight p of going
    one place deeper; .9 puts 86 % of the weight on the first ten places.

    Webber, Moffat, Zobel 2010 (ACM TOIS 28:4): tied nodes all stand at the block's first place and the agreement at
    depth d is 2 |S_d and T_d| / (|S_d| + |T_d|); a ranking that ends early (its network has fewer than ``depth`` nodes)
    goes on with the agreement it ended with. Without ties this is their extrapolated form for lists of uneven length.
    """
    if not 0.0 < persistence < 1.0:
        raise ValueError(f"persistence must lie strictly between 0 and 1, got {persistence!r}.")
    ends = sorted((min(len(before), depth), min(len(now), depth)))
    short, long = ends
    if short == 0:
        return 1.0 if long == 0 else 0.0
    size_before, size_now = _sizes(before, long), _sizes(now, long)
    shared = _sizes(np.maximum(common_before, common_now), long).astype(np.float64)
    at = np.arange(1, long + 1)
    agreement_at_end = 2.0 * shared[short - 1] / (size_before[short - 1] + size_now[short - 1])
    beyond = at > short
    shared[beyond] += agreement_at_end * (at[beyond] - short)
    shorter = size_before if len(before) < len(now) else size_now
    shorter[beyond] += at[beyond] - short
    agreement = 2.0 * shared / (size_before + size_now)
    weight = persistence**at
    return float((1.0 - persistence) / persistence * np.sum(agreement * weight) + agreement[-1] * weight[-1])


def top_footrule(before: Ids, now: Ids, common_before: Ids, common_now: Ids, *, depth: int) -> float:
    """The places that the nodes of two tops moved in all, as a share of what two disjoint tops would give.

    before, now: ranks of the nodes in each top. common_before, common_now: ranks of those in both, in one order. A node
    in one top only counts as standing at ``depth + 1`` in the other: Spearman's footrule with location parameter k + 1,
    F^(k+1) of Fagin, Kumar, Sivakumar 2003, whose maximum is k (k + 1). 0 = the same tops, 1 = nothing in common.
    """
    beyond = depth + 1
    to_edge = (beyond - before).sum() + (beyond - now).sum()
    none_common = float(to_edge)
    if none_common == 0.0:
        return 0.0
    moved = np.abs(common_before.astype(np.int64) - common_now).sum()
    came_and_left = to_edge - (beyond - common_before).sum() - (beyond - common_now).sum()
    return float(moved + came_and_left) / none_common


def _merged(first: Ids, second: Ids) -> Ids:
    """The sorted union of two sorted id arrays; a stable sort of two runs is a merge."""
    both = np.sort(np.concatenate((first, second)), kind="stable")
    union: Ids = both[np.append(True, both[1:] != both[:-1])[: len(both)]]
    return union


def _spread(ids: Ids, scores: ScoreSet) -> tuple[Floats, Ids]:
    """One night's values and ranks over the union of ids: NaN and 0 where the node was absent."""
    at = np.searchsorted(ids, scores.ids)
    value = np.full(len(ids), np.nan)
    rank = np.zeros(len(ids), np.int32)
    value[at] = scores.value
    rank[at] = scores.rank
    return value, rank


def _medians(growth: Floats, band: Ids) -> Floats:
    """The median of each node's band, per node."""
    median = np.zeros(int(band.max(initial=0)) + 1)
    order = np.argsort(band.astype(np.uint8), kind="stable")  # a radix sort: bands are few
    bands, starts = np.unique(band[order], return_index=True)
    for number, members in zip(bands, np.split(growth[order], starts[1:]), strict=False):
        median[number] = np.median(members)
    per_node: Floats = median[band]
    return per_node


def _sizes(rank: Ids, depth: int) -> Ints:
    """How many nodes have rank <= d, for d = 1..depth."""
    counts = np.bincount(np.minimum(rank, depth + 1), minlength=depth + 2)
    return np.cumsum(counts)[1 : depth + 1].astype(np.int64)
