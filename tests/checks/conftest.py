"""Small snapshots and profiles for these tests."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from datetime import date

import pytest
from plain_rules import run_plain_rules

from swaygauge.checks.rules import Rule
from swaygauge.records import Profile, RuleResult


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
