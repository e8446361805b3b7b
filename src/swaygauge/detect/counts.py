"""How surprising the number of new, or lost, endorsements of each node is.

Two things set what is expected: a node's standing (attention goes where endorsements already are) and its own recent
history. A gamma-distributed rate joins them: with prior shape kappa around the standing, ``past`` counts seen where
``expected`` were due, the next count has shape kappa + past and mean mu (kappa + past) / (kappa + expected).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from swaygauge.detect.tails import count_tails
from swaygauge.records import Flags, Floats, Ints

KAPPA_RANGE: Final = (0.05, 50.0)
KAPPA_AT_FIRST: Final = 1.0
SQUARES_CUT: Final = 0.999  # squares beyond this quantile count as the quantile when kappa is measured
LEAST_MEAN: Final = 1e-12  # where nothing at all was due, anything is surprising, but finitely so


@dataclass(frozen=True)
class CountHistory:
    """Discounted sums per node (n,), and over the network those that kappa is measured with."""

    past: Floats  # counts seen
    expected: Floats  # counts that were due by standing
    due_squares: float  # sum of mu^2
    excess_squares: float  # sum of (count - mu)^2 - mu, squares winsorised

    @property
    def kappa(self) -> float:
        """How closely nodes follow their standing: the shape of the gamma prior, by moments."""
        if self.due_squares == 0.0:
            return KAPPA_AT_FIRST
        if self.excess_squares <= self.due_squares / KAPPA_RANGE[1]:
            return KAPPA_RANGE[1]
        return max(self.due_squares / self.excess_squares, KAPPA_RANGE[0])

    @staticmethod
    def empty(nodes: int) -> CountHistory:
        """Nothing seen yet."""
        return CountHistory(np.zeros(nodes), np.zeros(nodes), 0.0, 0.0)

    def grown(self, nodes: int) -> CountHistory:
        """The same with room for nodes that were named since."""
        more = np.zeros(nodes - len(self.past))
        return CountHistory(
            np.concatenate((self.past, more)),
            np.concatenate((self.expected, more)),
            self.due_squares,
            self.excess_squares,
        )


@dataclass(frozen=True)
class CountModel:
    """What tonight's counts are judged against, per node (n,)."""

    count: Ints
    due: Floats  # mu: expected by standing alone
    shape: Floats  # of the node's own distribution
    mean: Floats  # expected by standing and own history


def due_by_standing(count: Ints, standing: Floats) -> Floats:
    """(n,) tonight's total shared out by standing (n,) >= 0.

    A single burst must not raise what is expected of everyone, so a node adds to the total at most 3 + 3 times its own
    due. That is the largest total that this rule gives back. The rule is concave and piecewise linear in the total, so
    Newton's steps from above fall to it and end after at most one per node.
    """
    whole = float(standing.sum())
    if whole == 0.0:
        return np.zeros(len(count))
    some = np.flatnonzero(count)
    seen, share = count[some].astype(np.float64), standing[some] / whole
    total = float(seen.sum())
    for _ in range(len(some)):
        over = 3.0 + 3.0 * total * share < seen
        slope = 3.0 * float(share[over].sum())
        settled = (float(seen[~over].sum()) + 3.0 * int(over.sum())) / (1.0 - slope) if slope < 1.0 else total
        if total - settled <= 1e-12 * total:
            break
        total = settled
    due: Floats = standing * (total / whole)
    return due


def model_counts(history: CountHistory, count: Ints, standing: Floats) -> CountModel:
    """Tonight's counts (n,) beside what the history up to last night expects."""
    due = due_by_standing(count, standing)
    shape = history.kappa + history.past
    return CountModel(count=count, due=due, shape=shape, mean=due * shape / (history.kappa + history.expected))


@dataclass(frozen=True)
class Surprise:
    """The nodes (k,) with any new or lost link, and how surprising the more surprising of the two counts is."""

    nodes: Ints
    rising: Flags  # the new links are the more surprising ones
    p: Floats  # (tails, k) two-sided, one row per tail exponent


def measure_surprise(gains: CountModel, losses: CountModel, present: Flags, exponents: Sequence[float]) -> Surprise:
    """Tail probabilities of tonight's counts for every present node that has any; all other nodes have p = 1."""
    nodes = np.flatnonzero(present & ((gains.count > 0) | (losses.count > 0)))
    gain, loss = (
        count_tails(
            model.count[nodes],
            shape=model.shape[nodes],
            mean=np.maximum(model.mean[nodes], LEAST_MEAN),
            exponents=exponents,
        )
        for model in (gains, losses)
    )
    return Surprise(nodes=nodes, rising=gain[0] <= loss[0], p=np.minimum(1.0, 2.0 * np.minimum(gain, loss)))


def remember_counts(
    history: CountHistory, model: CountModel, present: Flags, *, memory: float, dispersion_memory: float
) -> CountHistory:
    """The history after tonight."""
    squares = (model.count[present] - model.due[present]) ** 2
    if len(squares):
        squares = np.minimum(squares, np.quantile(squares, SQUARES_CUT))
    excess = float(squares.sum()) - float(model.due[present].sum())
    return CountHistory(
        past=memory * history.past + model.count,
        expected=memory * history.expected + model.due,
        due_squares=dispersion_memory * history.due_squares + float(np.sum(model.due[present] ** 2)),
        excess_squares=dispersion_memory * history.excess_squares + excess,
    )
