"""One way to set a score, and what it gives on one network."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass

from numpy.typing import ArrayLike

from swaygauge.graph import Graph
from swaygauge.records import Floats, SpectralBounds
from swaygauge.scores import SCORES, FairshareOptions, KatzOptions, Solution

Options = KatzOptions | FairshareOptions


@dataclass(frozen=True)
class Setting:
    """A score and its alpha. ``share`` is alpha times lambda: katz's own, and 1 for fairshare, whose lambda is 1."""

    score: str
    share: float
    alpha: float
    present: bool = False  # what the network is scored with now

    def solve(self, graph: Graph, *, options: Options, beta: ArrayLike, start: Floats | None = None) -> Solution:
        """Proven values of every node. Raises AlphaTooLarge, NotConverged, ScoreError.

        ``options`` are the score's settings; an alpha of their own gives way to this setting's. start (n,): values to
        start from; what comes out is proven all the same.
        """
        if isinstance(options, FairshareOptions):
            options = dataclasses.replace(options, alpha=self.alpha)
        return SCORES[self.score].solve(graph, options=options, alpha=self.alpha, beta=beta, start=start)


def settings_of(score: str, shares: tuple[float, ...], bounds: SpectralBounds, *, present: float) -> list[Setting]:
    """The settings to compare, by rising share: one per share, and the present alpha in its place among them.

    ``bounds`` hold on every night of the study, so katz at share / upper is legal on all of them. On a network without
    a cycle (upper = 0) every alpha is legal and the shares are taken as alphas themselves.

    >>> [s.alpha for s in settings_of("katz", (0.5, 0.9), SpectralBounds(4.0, 5.0), present=0.16)]
    [0.1, 0.16, 0.18]
    """
    unit = bounds.upper if score == "katz" and bounds.upper > 0.0 else 1.0
    alphas = {share / unit: share for share in shares}
    near = [alpha for alpha in alphas if abs(alpha - present) <= 1e-12 * present]
    for alpha in near:
        del alphas[alpha]
    alphas[present] = present * unit
    return [Setting(score, alphas[alpha], alpha, alpha == present) for alpha in sorted(alphas)]
