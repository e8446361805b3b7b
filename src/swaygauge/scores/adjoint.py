"""The adjoint y = e + alpha W y: how much each node's own importance, or a link into it, adds to chosen nodes' scores.

With e = 1 at node w, y . beta is the score of w, and a link u -> v of weight q adds alpha q x_u y_v to it (Katz; for
fairshare over the out-strength of u). It is the score's own equation over the links turned around.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from swaygauge.errors import NotConverged, ScoreError
from swaygauge.graph import Graph
from swaygauge.kernels import sweeping
from swaygauge.kernels.threads import in_parts
from swaygauge.records import Floats
from swaygauge.scores.affine import TIGHTEST, checked_alpha, plain_problem, shared_problem
from swaygauge.scores.solve import System, carry_on


@dataclass(frozen=True, eq=False)
class Adjoint:
    """y with its residual e + alpha W y - y, in the shape of the right-hand side."""

    value: Floats
    residual: Floats
    sweeps: int


def solve_adjoint(
    graph: Graph,
    score: str,
    right: ArrayLike,
    *,
    alpha: float,
    values: ArrayLike | None = None,
    tolerance: float = 1e-9,
) -> Adjoint:
    """y = e + alpha W y for one right-hand side (n,) or several (n, k), entries >= 0; W as in ``score``.

    Solved until |residual| . values <= tolerance * (e . values), where ``values`` (n,) > 0 are the score's own values
    (1 without): then y accounts for the scores of the chosen nodes up to that share. What is left unaccounted of any
    difference d of two score vectors is exactly residual . d, which is why the residual is handed back.

    Raises ScoreError for arguments that make no sense, NotConverged when the tolerance cannot be met.

    >>> solve_adjoint(Graph(3, [0, 1], [1, 2]), "katz", [0, 0, 1], alpha=0.5).value.tolist()
    [0.25, 0.5, 1.0]
    """
    system = _turned_system(graph, score, checked_alpha(alpha))
    given = np.asarray(right, np.float64)
    if given.shape[:1] != (graph.n,) or given.ndim > 2 or not (given >= 0.0).all() or not np.isfinite(given).all():
        raise ScoreError(f"right: expected {graph.n} finite numbers >= 0 per column, got shape {given.shape}.")
    worth = np.ones(graph.n) if values is None else np.asarray(values, np.float64)
    if worth.shape != (graph.n,):
        raise ScoreError(f"values: expected {graph.n} numbers, one per node, got shape {worth.shape}.")
    columns = given.reshape(graph.n, -1)
    value, residual = np.empty_like(columns), np.empty_like(columns)
    backwards = graph.order[::-1]
    sweeps = 0
    for k in range(columns.shape[1]):
        y, left, taken = _solved(system, columns[backwards, k], worth[backwards], tolerance)
        value[backwards, k], residual[backwards, k] = y, left
        sweeps = max(sweeps, taken)
    return Adjoint(value.reshape(given.shape), residual.reshape(given.shape), sweeps)


def _turned_system(graph: Graph, score: str, alpha: float) -> System:
    if score == "katz":
        problem = plain_problem(graph, alpha)
    elif score == "fairshare":
        problem = shared_problem(graph, alpha)
    else:
        raise ScoreError(f"score: expected 'katz' or 'fairshare', got {score!r}.")
    return System(graph.turned, alpha, problem.system.scale[::-1].copy())


def _solved(system: System, e: Floats, worth: Floats, tolerance: float) -> tuple[Floats, Floats, int]:
    """y, its residual and the sweeps, for one column, by turned position."""
    allowed = tolerance * float(np.sum(e * worth))
    y = e.copy()
    aim = tolerance
    while True:
        sweeps = carry_on(system, y, e, tolerance=aim)
        image = _image(system, y, e)
        y[system.rows.sources :] = image[system.rows.sources :]
        left = image - y
        missing = float(np.sum(np.abs(left) * worth))
        if missing <= allowed:
            return y, left, sweeps + 1
        if aim <= TIGHTEST:
            raise NotConverged(
                f"an adjoint is accounted for only up to {missing:.3g}, expected {allowed:.3g}. Use a larger tolerance."
            )
        aim = max(aim * 1e-2, TIGHTEST)


def _image(system: System, y: Floats, e: Floats) -> Floats:
    """e + alpha W y."""
    rows = system.rows
    image = np.empty(rows.n)
    stop = rows.start[1:].copy()
    in_parts(
        sweeping.sum_outside,
        rows.cuts,
        rows.start,
        stop,
        rows.source,
        rows.weight,
        y,
        e,
        system.alpha,
        system.scale,
        0,
        image,
    )
    return image
