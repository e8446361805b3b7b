"""The scores of a night: a table of names, cheap to import; the machinery behind a score loads when it is solved."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from importlib import import_module
from typing import TYPE_CHECKING, Final

from swaygauge.scores.options import FairshareOptions, KatzOptions
from swaygauge.scores.solution import Solution

if TYPE_CHECKING:
    from numpy.typing import ArrayLike

    from swaygauge.graph import Graph

__all__ = ["SCORES", "FairshareOptions", "KatzOptions", "Score", "Solution"]

Options = KatzOptions | FairshareOptions


@dataclass(frozen=True)
class Score:
    """One way to measure influence. ``function`` is "module:name" of a function like :func:`katz.katz_of_night`."""

    name: str
    summary: str
    options: type[Options]
    function: str

    def solve(
        self,
        graph: Graph,
        *,
        options: Options,
        alpha: float,
        beta: float | ArrayLike | None = None,
        start: ArrayLike | None = None,
    ) -> Solution:
        """The score of every node. ``alpha`` is the era's, which a score may have no use for; beta defaults to options.

        Raises AlphaTooLarge, NotConverged, ScoreError.
        """
        module, name = self.function.split(":")
        solution: Solution = getattr(import_module(module), name)(
            graph, options=options, alpha=alpha, beta=options.beta if beta is None else beta, start=start
        )
        return solution


SCORES: Final[Mapping[str, Score]] = {
    "katz": Score(
        "katz",
        "every target receives its source's full value, damped",
        KatzOptions,
        "swaygauge.scores.katz:katz_of_night",
    ),
    "fairshare": Score(
        "fairshare",
        "a source's value is split among its targets",
        FairshareOptions,
        "swaygauge.scores.fairshare:fairshare_of_night",
    ),
}
