"""Katz: x = beta + alpha A'x. Every target receives alpha times the full value of each node that endorses it.

Katz 1953, "A new status index derived from sociometric analysis", Psychometrika 18(1), 39-43.
"""

from __future__ import annotations

from datetime import date

from numpy.typing import ArrayLike

from swaygauge.errors import AlphaTooLarge, NotConverged, ScoreError
from swaygauge.graph import Graph
from swaygauge.records import Pin, SpectralBounds
from swaygauge.scores.affine import checked_alpha, plain_problem, solve_score
from swaygauge.scores.options import KatzOptions
from swaygauge.scores.solution import Solution
from swaygauge.scores.spectrum import bound_lambda


def katz(
    graph: Graph,
    *,
    alpha: float,
    beta: float | ArrayLike = 1.0,
    tolerance: float = 1e-10,
    start: ArrayLike | None = None,
    places: int | None = None,
) -> Solution:
    """Katz scores of every node, with proven error bounds.

    alpha >= 0 must be below 1/lambda; that is proven by the result itself. beta is one number or one per node, >= 0,
    the value of a node nobody endorses. ``start`` (n,) are values to start from, such as last night's: the result is
    within the same kind of bound. ``places`` = K tightens the tolerance until the first K places are proven in order.

    Raises AlphaTooLarge when alpha is not proven to be below 1/lambda, with the largest safe value; NotConverged when
    the tolerance cannot be met; ScoreError for arguments that make no sense.

    >>> katz(Graph(3, [0, 1], [1, 2]), alpha=0.5).value.tolist()  # a path: 1, 1 + a, 1 + a + a^2
    [1.0, 1.5, 1.75]
    """
    problem = plain_problem(graph, checked_alpha(alpha))
    try:
        return solve_score(graph, problem, beta=beta, tolerance=tolerance, start=start, places=places)
    except NotConverged:
        upper = bound_lambda(graph).upper
        if alpha * upper < 1.0:
            raise
        raise AlphaTooLarge(alpha, largest_safe=(1.0 - 1e-12) / upper, lambda_upper=upper) from None


def katz_of_night(
    graph: Graph, *, options: KatzOptions, alpha: float, beta: float | ArrayLike, start: ArrayLike | None
) -> Solution:
    """Katz as a night computes it, with the era's alpha."""
    return katz(graph, alpha=alpha, beta=beta, tolerance=options.tolerance, start=start)


def safe_alpha(bounds: SpectralBounds, share: float) -> float:
    """share / (proven upper bound on lambda). Raises ScoreError for a share outside (0, 1) or an acyclic network."""
    if not 0.0 < share < 1.0:
        raise ScoreError(f"share: expected a number between 0 and 1, got {share!r}.")
    if bounds.upper == 0.0:
        raise ScoreError("lambda is 0 (the network has no cycle): every alpha is legal, choose one.")
    return share / bounds.upper


def pin_alpha(previous: Pin | None, bounds: SpectralBounds, *, night: date, options: KatzOptions) -> tuple[Pin, bool]:
    """(the pin of the night, whether a new era starts with it).

    alpha = share / lambda is fixed once and kept, so that every comparison of two nights is like with like, until
    alpha * lambda exceeds the limit. Without a cycle alpha is ``options.acyclic_alpha``, noted as share 0.
    """
    if previous is not None and previous.alpha * bounds.upper <= options.limit:
        return previous, False
    share = options.share if bounds.upper > 0.0 else 0.0
    alpha = safe_alpha(bounds, share) if share else options.acyclic_alpha
    return Pin(alpha, share, night, bounds.lower, bounds.upper), True
