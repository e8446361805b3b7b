"""What is measured of a setting, and what is recommended from it."""

from __future__ import annotations

from datetime import date
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from study import dense

from swaygauge.records import SpectralBounds
from swaygauge.study.attenuation import Measured, Ranked, follow, gini_of, measure, top_octaves
from swaygauge.study.nights import NightGraph
from swaygauge.study.recommend import Recommendation, recommend
from swaygauge.study.setting import Setting, settings_of

DAY = [date(2030, 1, number) for number in range(1, 5)]
GRID = (0.5, 0.7, 0.8, 0.9)


def night(number: int, links: dense.Links, n: int = 30) -> NightGraph:
    beta = {"katz": np.ones(n), "fairshare": np.ones(n)}
    return NightGraph(DAY[number], np.arange(n, dtype=np.int32), dense.graph_of(n, links), beta, 1.0)


def random_links(seed: int, n: int = 30) -> dense.Links:
    random = np.random.default_rng(seed)
    pairs = {(int(random.integers(n)), int(n * random.random() ** 2)) for _ in range(5 * n)}
    return [(source, target, 1.0) for source, target in sorted(pairs) if source != target]


@settings(deadline=None)
@given(st.lists(st.floats(0.0, 100.0), min_size=1, max_size=20))
def test_gini_is_half_the_mean_difference(values: list[float]) -> None:
    """Definition: sum over all pairs of |x - y| / (2 n^2 mean)."""
    x = np.array(values)
    if x.sum() == 0.0 or x.mean() < 1e-200:
        return
    pairs = np.abs(x[:, None] - x[None, :]).sum() / (2.0 * len(x) ** 2 * x.mean())
    assert gini_of(x) == pytest.approx(pairs, abs=1e-9)


def test_octaves_of_the_top_of_either_night() -> None:
    before = Ranked(np.array([1, 2, 3, 4], np.int32), np.array([1, 2, 3, 8], np.int32))
    now = Ranked(np.array([2, 3, 4, 9], np.int32), np.array([1, 4, 2, 3], np.int32))
    assert top_octaves(before, now, top=2).tolist() == [1.0, 2.0]  # 2 -> 1 and 8 -> 2; 1 is gone, 3 is in no top


def test_settings_hold_the_present_alpha_once() -> None:
    bounds = SpectralBounds(4.0, 5.0)
    plain = settings_of("katz", GRID, bounds, present=0.8 / 5.0)
    assert [each.present for each in plain] == [False, False, True, False]
    assert [each.share for each in plain] == pytest.approx(GRID)
    acyclic = settings_of("katz", GRID, SpectralBounds(0.0, 0.0), present=0.5)
    assert [each.alpha for each in acyclic] == list(GRID)


def test_rows_are_what_dense_solves_give() -> None:
    links = random_links(1)
    nights = [night(0, links), night(1, links[:-3]), night(2, random_links(2))]
    settings = [Setting("fairshare", share, share, share == 0.7) for share in GRID]
    pairs = [(DAY[0], DAY[1]), (DAY[1], DAY[2])]
    courses = follow(nights, settings, options=dense.OPTIONS, quiet=pairs, top=5, studied=DAY[1])
    rows = measure(courses, nights[1], options=dense.OPTIONS, top=5)
    for row in rows:
        x = [dense.solve("fairshare", row.setting.alpha, 30, each) for each in (links, links[:-3], random_links(2))]
        ranks = [np.array([dense.place(value, node) for node in range(30)]) for value in x]
        octaves = [np.abs(np.log2(was / now))[np.minimum(was, now) <= 5].mean() for was, now in pairwise(ranks)]
        assert row.quiet_octaves == pytest.approx(np.mean(octaves))
        assert row.top_share == pytest.approx(np.sort(x[1])[-5:].sum() / x[1].sum())
        assert row.confirmed
        assert len(row.prices) == 5
        assert row.error is not None
        assert row.error < 1e-8
    assert [row.overlap_present for row in rows][1] == pytest.approx(1.0)
    assert rows[0].overlap_below is None
    assert rows[1].step == pytest.approx(0.2)


def test_a_setting_without_a_solution_says_so_and_leaves_the_others() -> None:
    """A ring of four has lambda = 1: alpha = 1.2 is illegal, and the message names the largest safe value."""
    ring = [(0, 1, 1.0), (1, 2, 1.0), (2, 3, 1.0), (3, 0, 1.0), *((leaf, 0, 1.0) for leaf in range(4, 30))]
    settings = [Setting("katz", 0.5, 0.5, True), Setting("katz", 1.2, 1.2)]
    only = night(0, ring)
    courses = follow([only], settings, options=dense.OPTIONS, quiet=[], top=3, studied=DAY[0])
    good, bad = measure(courses, only, options=dense.OPTIONS, top=3)
    assert not good.problem
    assert good.quiet_octaves is None
    assert "2030-01-01" in bad.problem
    assert "alpha" in bad.problem
    assert bad.price is None


def row(share: float, **found: Any) -> Measured:
    present = found.pop("present", False)
    usual = {"quiet_octaves": 0.01, "overlap_below": 0.99, "step": 0.1, "price": 50.0, "top_share": 0.2}
    return Measured(Setting("katz", share, share / 10.0, present), **(usual | found))


def advised(rows: list[Measured], *, quiet: int = 10, rise: float = 1.0, limit: float | None = 0.9) -> Recommendation:
    return recommend(rows, score="katz", shares=GRID, quiet=quiet, rise=rise, configured=0.8, limit=limit)


def test_the_largest_share_that_passes_is_named_with_reasons() -> None:
    told = advised([row(0.5), row(0.7), row(0.8, present=True), row(0.9, quiet_octaves=0.02)])
    assert told.share == 0.8
    assert "nothing has to change" in " ".join(told.reasons)
    assert any(reason.startswith("0.9 is not taken: moves more than") for reason in told.reasons)


def test_each_test_can_refuse() -> None:
    rows = [row(0.5), row(0.7), row(0.8), row(0.9)]
    assert advised(rows).share == 0.9
    assert advised(rows, rise=1.1).share == 0.8
    assert advised(rows, rise=1.2).share == 0.7
    assert advised(rows, rise=1.2, limit=None).share == 0.9
    assert advised([*rows[:3], row(0.9, overlap_below=0.85)]).share == 0.8
    assert advised([*rows[:3], row(0.9, overlap_below=0.92)]).share == 0.9  # a step of .1 may change twice as much


def test_what_the_present_setting_costs_is_said() -> None:
    rows = [row(0.7), row(0.85, present=True, quiet_octaves=0.03, price=200.0), row(0.9, quiet_octaves=0.04)]
    told = advised(rows)
    assert told.share == 0.7
    assert "3.00 times as much" in told.reasons[-1]
    assert "4.00 times as many endorsers" in told.reasons[-1]
    assert "the settings ask for 0.8" in told.reasons[-2]


def test_nothing_is_recommended_from_hearsay() -> None:
    told = advised([row(0.5), row(0.7)], quiet=2)
    assert told.share is None
    assert "2 quiet night(s), fewer than 3" in told.reasons[-1]
    unsolved = Measured(Setting("katz", 0.9, 0.09), "night 2030-01-01: too large")
    assert "0.9 is out" in advised([row(0.5), unsolved]).reasons[0]
    assert advised([unsolved]).share is None


def test_when_no_share_passes_the_calmest_is_named_and_no_more_claimed() -> None:
    told = advised([row(0.5, quiet_octaves=0.02), row(0.7)], rise=2.0)
    assert told.share == 0.7
    assert "no more is claimed" in told.reasons[0]
