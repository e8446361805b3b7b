import numpy as np
import pytest

from swaygauge.detect import LeadingPair, Ring, is_lambda_jump, name_ring
from swaygauge.records import NEW, Flags, LinkChanges, SpectralBounds

CORE, RING = 120, 14


def spectral_radius(dense: np.ndarray) -> float:
    return float(np.abs(np.linalg.eigvals(dense)).max())


def leading(dense: np.ndarray) -> np.ndarray:
    values, vectors = np.linalg.eig(dense)
    return np.abs(vectors[:, np.argmax(values.real)].real)


def changes_of(pairs: list[tuple[int, int]], *, coverage: bool = False) -> LinkChanges:
    source, target = np.array(sorted(pairs, key=lambda pair: pair[::-1]), np.int32).T
    ones = np.ones(len(pairs))
    flags = np.full(len(pairs), coverage)
    return LinkChanges(source, target, np.full(len(pairs), NEW, np.uint8), 0 * ones, ones, flags)


class Network:
    """A dense random core, and what is added to it tonight."""

    def __init__(self, seed: int = 4) -> None:
        random = np.random.default_rng(seed)
        self.before = (random.random((CORE + RING, CORE + RING)) < 0.05).astype(float)
        self.before[CORE:] = 0.0
        self.before[:, CORE:] = 0.0
        np.fill_diagonal(self.before, 0.0)
        self.random = random

    def add(self, pairs: list[tuple[int, int]], *, coverage: bool = False) -> tuple[LinkChanges, LeadingPair, float]:
        pairs = sorted({(u, v) for u, v in pairs if u != v and not self.before[u, v]})
        changes = changes_of(pairs, coverage=coverage)
        now = self.before.copy()
        now[changes.source, changes.target] = 1.0
        self.now, self.calls = now, 0

        def lambda_without(rows: Flags) -> float:
            self.calls += 1
            less = now.copy()
            less[changes.source[rows], changes.target[rows]] = 0.0
            return spectral_radius(less)

        pair = LeadingPair(np.arange(len(now), dtype=np.int32), leading(now.T), leading(now), lambda_without)
        return changes, pair, spectral_radius(self.before)

    def everyday(self, count: int) -> list[tuple[int, int]]:
        """Ordinary new links within the core."""
        pairs = self.random.permutation(np.argwhere(self.before[:CORE, :CORE] + np.eye(CORE) == 0))[:count]
        return [(int(u), int(v)) for u, v in pairs]


def clique(members: list[int]) -> list[tuple[int, int]]:
    return [(u, v) for u in members for v in members if u != v]


@pytest.mark.parametrize("tied", [False, True])
def test_a_ring_of_fresh_nodes_is_named_with_or_without_ties_to_the_core(tied: bool) -> None:
    network, members = Network(), list(range(CORE, CORE + RING))
    ties = [(member, 3) for member in members] + [(5, member) for member in members[:4]] if tied else []
    changes, pair, before = network.add(clique(members) + ties + network.everyday(10))
    ring = name_ring(changes, pair, before)
    assert set(members) <= set(ring.nodes.tolist())
    aside = list(zip(changes.source[ring.rows].tolist(), changes.target[ring.rows].tolist(), strict=True))
    assert set(clique(members)) <= set(aside)
    assert not [pair for pair in aside if pair[0] < CORE and pair[1] < CORE]  # no innocent link
    assert ring.enough
    assert ring.lambda_without <= 1.03 * before
    assert network.calls <= 4 * np.log2(CORE + RING)


def test_a_ring_of_existing_nodes() -> None:
    network = Network()
    members = list(range(20, 20 + RING + 4))
    changes, pair, before = network.add(clique(members) + network.everyday(6))
    ring = name_ring(changes, pair, before)
    assert set(members) <= set(ring.nodes.tolist())
    assert ring.enough


def test_the_prefix_is_the_smallest_that_is_enough() -> None:
    network, members = Network(), list(range(CORE, CORE + RING))
    changes, pair, before = network.add(clique(members) + [(member, 3) for member in members] + [(5, CORE)])
    strict = name_ring(changes, pair, before, or_to=1.01, least_mass=1.0)
    named = strict.nodes.tolist()
    enough = []
    for size in range(1, len(named) + 1):
        first = np.isin(changes.source, named[:size]) & np.isin(changes.target, named[:size])
        enough.append(pair.lambda_without(first) <= 1.01 * before)
    assert enough[-1]
    # nodes of equal mass are closed in together; before them nothing is enough
    lighter = strict.mass < strict.mass[len(named) - 1] * (1 + 1e-9)
    assert not any(enough[: int(np.argmax(lighter))])


def test_masses_predict_the_gain_of_lambda_in_the_first_order() -> None:
    network = Network()
    changes, pair, before = network.add(network.everyday(1))
    ring = name_ring(changes, pair, 0.0)  # an unreachable level: everything is named
    gain = spectral_radius(network.now) - before
    assert ring.mass[0] == pytest.approx(gain, rel=0.3)
    assert not ring.enough


def test_links_that_only_tell_of_the_crawl_are_not_named() -> None:
    network, members = Network(), list(range(CORE, CORE + RING))
    changes, pair, before = network.add(clique(members), coverage=True)
    ring = name_ring(changes, pair, before)
    assert (len(ring.nodes), ring.rows.any(), ring.enough) == (0, False, False)


def test_naming_does_not_depend_on_the_scale_of_the_vectors() -> None:
    network, members = Network(), list(range(CORE, CORE + RING))
    changes, pair, before = network.add(clique(members) + network.everyday(10))
    scaled = LeadingPair(pair.ids, 7.0 * pair.right, 0.01 * pair.left, pair.lambda_without)
    first, second = name_ring(changes, pair, before), name_ring(changes, scaled, before)
    assert isinstance(first, Ring)
    assert set(first.nodes.tolist()) == set(second.nodes.tolist())
    assert first.mass == pytest.approx(second.mass)


@pytest.mark.parametrize(
    ("before", "now", "jumped"),
    [((10.0, 10.0), (10.2, 10.4), False), ((10.0, 10.1), (10.5, 10.5), True), ((0.0, 0.0), (1.0, 1.0), True)],
)
def test_a_jump_must_be_proven(before: tuple[float, float], now: tuple[float, float], jumped: bool) -> None:
    assert is_lambda_jump(SpectralBounds(*before), SpectralBounds(*now), jump=0.03) is jumped
