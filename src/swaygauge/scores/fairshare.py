"""Fairshare: x = beta + alpha A' D^-1 x. Each source's value, damped, is split among its targets by link weight.

With one beta for all, x / sum(x) is PageRank with uniform dangling and teleport: Page, Brin, Motwani, Winograd 1999,
"The PageRank citation ranking", Stanford InfoLab 1999-66.
"""

from __future__ import annotations

from numpy.typing import ArrayLike

from swaygauge.errors import ScoreError
from swaygauge.graph import Graph
from swaygauge.scores.affine import checked_alpha, shared_problem, solve_score
from swaygauge.scores.options import FairshareOptions
from swaygauge.scores.solution import Solution


def fairshare(
    graph: Graph,
    *,
    alpha: float = 0.85,
    beta: float | ArrayLike = 1.0,
    tolerance: float = 1e-10,
    start: ArrayLike | None = None,
    places: int | None = None,
) -> Solution:
    """Fair-share scores of every node, with proven error bounds.

    0 <= alpha < 1 is the share of a value that is passed on; the other arguments are as in :func:`katz.katz`. A node
    without out-links passes nothing on. Raises ScoreError, NotConverged.

    >>> fairshare(Graph(3, [0, 0], [1, 2]), alpha=0.8).value.tolist()
    [1.0, 1.4, 1.4]
    """
    if not checked_alpha(alpha) < 1.0:
        raise ScoreError(f"alpha: fairshare passes on less than all of a value; expected less than 1, got {alpha!r}.")
    problem = shared_problem(graph, float(alpha))
    return solve_score(graph, problem, beta=beta, tolerance=tolerance, start=start, places=places)


def fairshare_of_night(
    graph: Graph, *, options: FairshareOptions, alpha: float, beta: float | ArrayLike, start: ArrayLike | None
) -> Solution:
    """Fairshare as a night computes it. Its alpha is an option of its own; the pinned alpha belongs to katz."""
    del alpha
    return fairshare(graph, alpha=options.alpha, beta=beta, tolerance=options.tolerance, start=start)
