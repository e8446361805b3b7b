"""The generator: the same arguments give the same world; its two models of change, its crawl and its scoring."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
from islands import events as plant
from islands.change import calm
from islands.crawl import Crawl, Fault
from islands.lively import lively, stories_of
from islands.ostrel import build
from islands.scoring import octaves, spectral_radius, standing
from islands.series import Runner, Series
from islands.world import World, contains, draw, draw_near


def small_run(seed: int, *, change=calm, nights: int = 12, faults=None, events=None, drips=None) -> Series:
    world = build(seed, size=600, links=3600)
    crawl = Crawl(np.random.default_rng([seed, 4]), faults=faults or {})
    return Runner(world, change(), crawl, events=events or {}, drips=drips or {}, seed=seed).run(nights)


@pytest.mark.parametrize("change", [calm, lively])
def test_same_seed_same_world_other_seed_other_world(change):
    one, two, other = (small_run(seed, change=change) for seed in (5, 5, 6))
    assert one.world.names == two.world.names
    for a, b in zip(one.shots, two.shots, strict=True):
        np.testing.assert_array_equal(a.keys, b.keys)
        np.testing.assert_array_equal(a.seen.rows, b.seen.rows)
    assert not np.array_equal(one.shots[-1].keys, other.shots[-1].keys)


@pytest.mark.parametrize("change", [calm, lively])
def test_links_stay_sorted_distinct_and_between_the_living(change):
    series = small_run(3, change=change, nights=20)
    world = series.world
    assert np.all(np.diff(world.keys) > 0)
    assert not np.any(world.source == world.target)
    assert world.alive[world.source].all()
    assert world.alive[world.target].all()
    assert len(world.keys) == len(world.born) == len(world.weight)
    assert len(set(world.names)) == len(world.names) == world.size


def test_volumes_of_the_two_models():
    """New and lost links a night on 46 nights, as a share of the first night's (the models' own definitions)."""
    for change, born, gone in (
        (calm, (0.0026, 0.0042), (0.0013, 0.0026)),
        (lively, (0.0018, 0.0050), (0.0015, 0.0040)),
    ):
        world = build(11, size=1500, links=12000)
        series = Runner(world, change(), Crawl(np.random.default_rng(1))).run(46)
        pairs = list(zip(series.shots, series.shots[1:], strict=False))
        came = np.mean([(~contains(a.keys, b.keys)).sum() for a, b in pairs]) / world.first_links
        went = np.mean([(~contains(b.keys, a.keys)).sum() for a, b in pairs]) / world.first_links
        assert born[0] < came < born[1], (change, came)
        assert gone[0] < went < gone[1], (change, went)


def test_the_lively_model_bursts_more_than_the_calm_one_and_lists_its_stories():
    """Variance over mean of a node's nightly gains: near 1 for the calm model, far above it for the lively one."""

    def unevenness(change):
        series = small_run(8, change=change, nights=46)
        gains = []
        for a, b in zip(series.shots, series.shots[1:], strict=False):
            new = b.keys[~contains(a.keys, b.keys)] % series.world.capacity
            gains.append(np.bincount(new, minlength=series.world.capacity))
        return float(np.var(gains) / np.mean(gains))

    quiet, loud = unevenness(calm), unevenness(lively)
    assert quiet < 2.0
    assert loud > 1.2 * quiet
    model = lively()
    small_run(8, change=lambda: model, nights=46)
    assert stories_of(model)
    assert all(night >= story.night for story in stories_of(model) for night in story.links)


def test_partial_crawl_and_capped_lists():
    series = small_run(2, faults={5: Fault(missing=0.35), 8: Fault(cap=9)})
    partial, capped = series.shots[5], series.shots[8]
    capacity = series.world.capacity
    sources = np.unique(partial.keys // capacity)
    assert 0.27 < len(partial.seen.unfetched) / len(sources) < 0.43
    assert not np.isin(partial.observed.keys // capacity, partial.seen.unfetched).any()
    lists = np.bincount(capped.observed.keys // capacity, minlength=capacity)
    assert lists.max() == 9
    assert (lists[capped.seen.cut] == 9).all()
    true_lists = np.bincount(capped.keys // capacity, minlength=capacity)
    assert (true_lists[capped.seen.cut] > 9).all()


def test_a_link_is_seen_on_the_night_it_is_born():
    series = small_run(4)
    for before, now in zip(series.shots, series.shots[1:], strict=False):
        born = now.keys[~contains(before.keys, now.keys)]
        assert contains(now.observed.keys, born).all()


def test_scores_agree_with_dense_algebra_and_networkx():
    """x = (I - alpha W')^-1 1 by numpy.linalg.solve; fair share is proportional to networkx.pagerank (alpha .85)."""
    rng = np.random.default_rng(9)
    n = 40
    keys = np.unique(rng.integers(0, n * n, 220))
    keys = keys[keys // n != keys % n]
    a = np.zeros((n, n))
    a[keys // n, keys % n] = 1
    assert spectral_radius(keys, n) == pytest.approx(np.abs(np.linalg.eigvals(a)).max(), rel=1e-9)
    alpha = 0.8 / spectral_radius(keys, n)
    exact = np.linalg.solve(np.eye(n) - alpha * a.T, np.ones(n))
    np.testing.assert_allclose(standing(keys, n, "katz", alpha=alpha).value, exact, rtol=1e-9)
    graph = nx.from_numpy_array(a, create_using=nx.DiGraph)
    rank = nx.pagerank(graph, alpha=0.85, tol=1e-14, max_iter=1000)
    fair = standing(keys, n, "fairshare", alpha=0.85).value
    np.testing.assert_allclose(fair / fair.sum(), [rank[i] for i in range(n)], rtol=1e-9)


def test_octaves():
    assert octaves(40, 20) == 1.0
    assert octaves(100, 400) == -2.0
    assert octaves(0, 5) is None


def test_drawing_follows_the_weights_and_stays_in_the_group():
    rng = np.random.default_rng(1)
    weights = np.array([0.0, 1.0, 3.0, 0.0, 4.0])
    counts = np.bincount(draw(rng, weights, 80000), minlength=5)
    np.testing.assert_allclose(counts / 80000, weights / 8, atol=0.01)  # five sd of a share is below .01
    group = np.array([0, 1, 1, 0, 0])
    near = draw_near(rng, weights, group, np.array([1] * 1000 + [0] * 1000))
    assert set(near[:1000]) == {1, 2}
    assert set(near[1000:]) == {4}


def test_a_full_world_says_so():
    world = World(np.array([0]), np.array([1]), group=np.zeros(2, int), capacity=3, rng=np.random.default_rng(0))
    world.enroll(1, night=1)
    with pytest.raises(ValueError, match="larger capacity"):
        world.enroll(1, night=1)


def test_every_event_does_what_its_record_says():
    events = {
        3: (plant.fresh_farm(20, (20, 200)),),
        4: (plant.aged_farm(10, (20, 200)),),
        5: (plant.news(10, (20, 200)),),
        6: (plant.newcomers_wave(12, (20, 200)),),
        7: (plant.hub_link((100, 400), gain=0.2),),
        8: (plant.hub_drop((30, 400), loss=0.1),),
        9: (plant.rename((10, 60), aliased=False),),
        10: (plant.departure((10, 60)),),
        11: (plant.ring(12, 4),),
    }
    series = small_run(7, events=events, drips={3: (plant.Drip(2, 6, (20, 200)),)})
    assert len(series.planted) == len(events) + 1
    for planted in series.planted:
        before, now = series.shots[planted.night - 1].keys, series.shots[planted.night].keys
        if planted.event != "slow drip":
            assert contains(now, planted.added).all()
        assert not contains(before, planted.added).any()
        assert contains(np.union1d(before, now), planted.removed).sum() == contains(before, planted.removed).sum()
        assert not contains(now, planted.removed).any()
        moved = [effect for effect in series.effects if effect.planted is planted and effect.octaves is not None]
        if planted.event in ("fresh farm", "aged farm", "news", "newcomers wave", "hub link"):
            # an added link never lowers its target (Boldi, Luongo, Vigna 2017); the others' places may shift
            assert all(effect.value_with > effect.value_without for effect in moved)
        if planted.event == "hub drop":
            assert all(effect.value_with < effect.value_without for effect in moved)
    drip = next(planted for planted in series.planted if planted.event == "slow drip")
    assert len(drip.sources) == 12
    assert (series.world.since[drip.sources] >= 3).all()


def test_an_event_without_a_fitting_node_says_so():
    with pytest.raises(ValueError, match="only 0 do"):
        small_run(7, events={3: (plant.news(5, (9000, 9999)),)})
