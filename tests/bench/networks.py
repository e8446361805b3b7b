"""Made-up networks of the shape that real ones have, in any size: heavy tails, strong components, leaks, communities.

Recursive-matrix links after Chakrabarti, Zhan, Faloutsos 2004 ("R-MAT", SDM). Seeded: the same call, the same links.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Ids = NDArray[np.int32]


@dataclass(frozen=True)
class Links:
    """n nodes, links source -> target, distinct, in no particular order."""

    n: int
    source: Ids
    target: Ids


def web(links: int, *, seed: int = 1) -> Links:
    """About ``links`` links among a tenth as many nodes: a dense core, nodes nobody endorses, dangling nodes, an
    acyclic region and many small rings. A third of the nodes are dangling, a third are not endorsed."""
    rng = np.random.default_rng(seed)
    n = links // 10
    core, acyclic, rings, fans = n // 2, n // 8, n // 20, n // 6
    u, v = _recursive(rng, int(0.82 * links), core)
    reply = rng.random(len(u)) < 0.2
    parts = [(u, v), (v[reply], u[reply])]
    base = core
    low, high = np.sort(rng.integers(0, acyclic, (2, links // 12)), axis=0)
    parts.append((base + low, base + high))
    parts.append((u[rng.integers(0, len(u), links // 100)], base + rng.integers(0, acyclic, links // 100)))
    base += acyclic
    ring = np.arange(rings)
    parts.append((base + ring, base + np.where(ring % 9 == 8, ring - 8, np.minimum(ring + 1, rings - 1))))
    base += rings
    k = links // 10
    parts.append((base + (fans * rng.random(k) ** 2).astype(np.int64), v[rng.integers(0, len(v), k)]))
    base += fans
    parts.append((u[rng.integers(0, len(u), k)], base + ((n - base) * rng.random(k) ** 3).astype(np.int64)))
    return _finished(rng, n, parts)


def communities(links: int, *, seed: int = 2, count: int = 16) -> Links:
    """``count`` communities, each with .6 % fewer links than the one before, and one link in 200 between them.

    The largest eigenvalues lie within about a percent of each other.
    """
    rng = np.random.default_rng(seed)
    n = links // 10
    size = n // count
    parts = []
    for c in range(count):
        u, v = _recursive(rng, int((1.1 - 0.006 * c) * links / count), size)
        parts.append((c * size + u, c * size + v))
    across = rng.integers(0, n, (2, links // 200))
    parts.append((across[0], across[1]))
    return _finished(rng, n, parts)


def _recursive(rng: np.random.Generator, links: int, n: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Links among n nodes whose degrees have heavy tails, quadrant chances .57, .19, .19, .05 at every level."""
    levels = max(1, int(np.ceil(np.log2(max(n, 2)))))
    u, v = np.zeros(links, np.int64), np.zeros(links, np.int64)
    for _ in range(levels):
        chance = rng.random(links, dtype=np.float32)
        u = 2 * u + (chance >= 0.76)
        v = 2 * v + (((chance >= 0.57) & (chance < 0.76)) | (chance >= 0.95))
    inside = (u < n) & (v < n)
    return u[inside], v[inside]


def _finished(rng: np.random.Generator, n: int, parts: list[tuple[NDArray[np.int64], NDArray[np.int64]]]) -> Links:
    """All parts together: no self-links, no repeats, node numbers and order shuffled."""
    name = rng.permutation(n)
    keys = np.concatenate([name[u] * n + name[v] for u, v in parts])
    keys = np.unique(keys[keys // n != keys % n])
    rng.shuffle(keys)
    return Links(n, (keys // n).astype(np.int32), (keys % n).astype(np.int32))
