"""Small snapshots and profiles for these tests."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from datetime import date, timedelta

import numpy as np
import pytest
from plain_rules import run_plain_rules

from swaygauge.checks.rules import Rule
from swaygauge.records import Origin, Profile, RuleResult, Snapshot


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


@pytest.fixture
def sound() -> Profile:
    """A quiet night's profile, with history."""
    return Profile(
        night=date(2030, 2, 1),
        rows=20_500,
        links=20_000,
        nodes=3_000,
        sources=2_500,
        targets=2_000,
        duplicates=400,
        self_links=10,
        dropped=0,
        weight_min=1.0,
        weight_max=1.0,
        weight_sum=20_000.0,
        longest_list=400,
        new_nodes=0.001,
        kept=0.99,
        lost=0.004,
        hub=0.0,
        cut=0,
        shrunk=0.002,
        node_ratio=1.0,
        link_ratio=1.0,
        history=14,
        base_links=18_240,
        base_sources=1_203,
        base_hubs=100,
        base_lists=812,
        base_nodes=3_000.0,
    )


@pytest.fixture(scope="session")
def plain_rules() -> Callable[[Sequence[Rule], Mapping[str, float | None]], tuple[RuleResult, ...]]:
    """What run_rules must say, in plain Python; a test holds the two against each other, long replays use this one."""

    return run_plain_rules
