"""x = beta + alpha W'x for the two links matrices in use: from arguments by node to proven values by node."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from swaygauge.errors import NotConverged, ScoreError
from swaygauge.graph import NO_WEIGHT, Graph
from swaygauge.records import Floats
from swaygauge.scores.proof import Proof, prove
from swaygauge.scores.ranks import proven_places
from swaygauge.scores.solution import Solution
from swaygauge.scores.solve import System, solve
from swaygauge.scores.spectrum import bound_lambda

TIGHTEST = 1e-16  # no residual / beta below this is worth asking for: rounding is in the way


@dataclass(frozen=True, eq=False)
class Problem:
    """One score on one network: the system in positions, and how z and values belong together."""

    system: System
    strength: Floats  # (n,) by position where z = value / strength, else of length 0
    legal: Callable[[], bool]  # whether alpha is proven to be legal by other means than the values themselves

    def solved(self, beta: Floats, tolerance: float, start: Floats | None, yardstick: Proof | None) -> Proof:
        """Solve and prove, everything by position."""
        scale = self.system.scale
        h = beta * scale if len(scale) else beta
        if start is not None and len(scale):
            start = start * scale
        solved = solve(self.system, h, tolerance=tolerance, start=start)
        return prove(self.system, solved, beta, self.strength, yardstick=yardstick, legal=self.legal)


def plain_problem(graph: Graph, alpha: float) -> Problem:
    """W = A: every target receives the source's full value."""
    return Problem(System(graph.rows, alpha, NO_WEIGHT), NO_WEIGHT, lambda: alpha * bound_lambda(graph).upper < 1.0)


def shared_problem(graph: Graph, alpha: float) -> Problem:
    """W = D^-1 A: each source's value is split among its targets."""
    strength = graph.strength
    scale = np.divide(1.0, strength, out=np.zeros(graph.n), where=strength > 0.0)
    return Problem(System(graph.rows, alpha, scale), strength, lambda: alpha < 1.0)


def solve_score(
    graph: Graph,
    problem: Problem,
    *,
    beta: float | ArrayLike,
    tolerance: float,
    start: ArrayLike | None,
    places: int | None,
) -> Solution:
    """Proven values by node; with ``places``, the tolerance is tightened until that many first places are in order."""
    own = _checked_beta(beta, graph.n)[graph.order]
    first = None if start is None else _checked_start(start, graph.n)[graph.order]
    if graph.n == 0:
        return Solution(np.empty(0), np.empty(0), 0.0, 0, problem.system.alpha)
    yardstick = None
    if not own.min() > 0.0:
        yardstick = problem.solved(np.ones(graph.n), tolerance, None, None)
    while True:
        proof = problem.solved(own, tolerance, first, yardstick)
        value, bound = proof.x[graph.place], proof.bound[graph.place]
        if places is None:
            break
        proven = proven_places(value, bound)
        if proven >= min(places, graph.n):
            break
        if tolerance <= TIGHTEST:
            raise NotConverged(
                f"only the first {proven} places could be proven in order, asked for {places}: the next values are "
                f"closer than rounding allows to tell. Ask for {proven} places or fewer, or drop ``places``."
            )
        tolerance, first = max(tolerance * 1e-2, TIGHTEST), proof.x
    return Solution(value, bound, proof.residual, proof.sweeps, problem.system.alpha)


def checked_alpha(alpha: float) -> float:
    """alpha as a float. Raises ScoreError when it is not a finite number >= 0."""
    if not (math.isfinite(alpha) and alpha >= 0.0):
        raise ScoreError(f"alpha: expected a finite number >= 0, got {alpha!r}.")
    return float(alpha)


def _checked_beta(beta: float | ArrayLike, n: int) -> Floats:
    given = np.asarray(beta, np.float64)
    if given.shape not in ((), (n,)):
        raise ScoreError(f"beta: expected one number or {n} of them, one per node, got shape {given.shape}.")
    own = np.ascontiguousarray(np.broadcast_to(given, (n,)), np.float64)
    bad = np.flatnonzero(~((own >= 0.0) & (own < np.inf)))
    if len(bad):
        raise ScoreError(f"beta: expected finite numbers >= 0, got {own[bad[0]]} for node {bad[0]}.")
    if n and not own.any():
        raise ScoreError("beta: expected at least one node with a value > 0, got only 0.")
    return own


def _checked_start(start: ArrayLike, n: int) -> Floats:
    given = np.asarray(start, np.float64)
    if given.shape != (n,) or not np.isfinite(given).all():
        raise ScoreError(f"start: expected {n} finite numbers, one per node, got shape {given.shape}.")
    return given
