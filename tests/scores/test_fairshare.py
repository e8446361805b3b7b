"""What belongs to fairshare alone."""

from __future__ import annotations

import numpy as np
import pytest

from swaygauge.errors import ScoreError
from swaygauge.graph import Graph
from swaygauge.scores import SCORES, FairshareOptions
from swaygauge.scores.fairshare import fairshare


def test_alpha_of_one_is_refused() -> None:
    with pytest.raises(ScoreError, match=r"expected less than 1, got 1\.0"):
        fairshare(Graph(2, [0], [1]), alpha=1.0)


def test_the_pinned_alpha_is_not_its_own() -> None:
    graph = Graph(3, [0, 1, 2], [1, 2, 0])
    solution = SCORES["fairshare"].solve(graph, options=FairshareOptions(alpha=0.6), alpha=17.0)
    assert solution.alpha == 0.6
    np.testing.assert_allclose(solution.value, np.full(3, 2.5), rtol=1e-9)


def test_shares_follow_the_weights() -> None:
    value = fairshare(Graph(3, [0, 0], [1, 2], weight=[3.0, 1.0]), alpha=0.8).value
    np.testing.assert_allclose(value, [1.0, 1.6, 1.2], rtol=1e-12)
