"""Score sets from plain dictionaries of values."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date

import numpy as np
import pytest

from swaygauge.records import ScoreSet


def from_values(values: dict[int, float], *, night: int = 1, score: str = "katz", alpha: float = 0.1) -> ScoreSet:
    """A score set with competition ranks; equal values tie."""
    ids = np.array(sorted(values), np.int32)
    value = np.array([values[int(node)] for node in ids], np.float64)
    rank = (1 + (value[None, :] > value[:, None]).sum(axis=1)).astype(np.int32)
    return ScoreSet(
        date(2031, 3, night), score, alpha, ids, value, 1e-10 * value, rank, rank, rank, residual=1e-11, sweeps=9
    )


@pytest.fixture
def score_set() -> Callable[..., ScoreSet]:
    return from_values
