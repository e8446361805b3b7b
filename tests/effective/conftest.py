"""Small snapshots for these tests."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from datetime import date, timedelta

import numpy as np
import pytest

from swaygauge.records import Origin, Snapshot


def snapshot_of(
    lists: Mapping[int, Iterable[int] | Mapping[int, float]], day: int, *, fetched: Iterable[int] | None = None
) -> Snapshot:
    """``lists``: source -> its targets, or source -> {target: weight}; ``day`` counts from 2030-01-01."""
    links = sorted((target, source) for source, targets in lists.items() for target in targets)
    weights = [
        float(w)
        for _, w in sorted(((t, s), w) for s, ts in lists.items() if isinstance(ts, Mapping) for t, w in ts.items())
    ]
    return Snapshot(
        night=date(2030, 1, 1) + timedelta(days=day),
        source=np.array([source for _, source in links], dtype=np.int32),
        target=np.array([target for target, _ in links], dtype=np.int32),
        weight=np.array(weights) if weights else None,
        origin=Origin("made.csv", "0" * 64, 1, "csv", len(links)),
        fetched=None if fetched is None else np.array(sorted(fetched), dtype=np.int32),
    )


@pytest.fixture(scope="session", name="snapshot_of")
def _snapshot_of() -> Callable[..., Snapshot]:
    return snapshot_of
