"""Frozen types that travel between stages.

Many rows are one record of arrays (plural or collective name); few rows are one record each. Node ids are positions in
the network's name table (int32, persistent over nights). ``night`` is the date a snapshot stands for. Arrays are
read-only once inside a record; make one with :func:`frozen`.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import date
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

Ids = NDArray[np.int32]
Ints = NDArray[np.int64]
Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Codes = NDArray[np.uint8]

# Link states of a LinkBook (what is scored is everything below GONE).
SEEN: Final = 0  # in tonight's snapshot
CARRIED: Final = 1  # its source was not fetched tonight; the last known link stands
WAITING: Final = 2  # missing once from a fetched source; stands until the source is fetched again
GONE: Final = 3  # not in effect; remembered so that a return is not taken for news
SHELVED: Final = 4  # not in effect since a new baseline; remembered without end

# What happened to a link between two effective snapshots.
NEW: Final = 0  # in effect now, not in effect before and not seen within the memory
RETURNED: Final = 1  # in effect again, seen within the memory
LOST: Final = 2  # no longer in effect
REWEIGHTED: Final = 3  # in effect on both nights with another weight
EXPIRED: Final = 4  # no longer in effect because its source stayed unfetched too long

# Status of a node in Moves.
MOVED: Final = 0  # present on both nights (its rank may be unchanged)
ARRIVED: Final = 1
DEPARTED: Final = 2


def frozen(array: NDArray[Any]) -> NDArray[Any]:
    """The same array, switched to read-only (a view of a writable base is copied first)."""
    if array.base is not None:
        array = array.copy()
    array.setflags(write=False)
    return array


@dataclass(frozen=True)
class Origin:
    """Where a snapshot came from and what reading it did."""

    file: str  # name only, never a path
    sha256: str
    size: int  # bytes
    reader: str
    rows: int  # data rows read, good and bad
    dropped: tuple[tuple[str, int], ...] = ()  # reason -> rows left out (only with bad_rows = "drop")
    dropped_samples: tuple[str, ...] = ()  # "line 418: weight must be ...", the first hundred
    names_merged: int = 0  # distinct names that host normalisation folded into another
    aliased: int = 0  # distinct names that the alias table mapped to an older id


@dataclass(frozen=True)
class Snapshot:
    """One night's links as they arrived: distinct, without self-links unless configured, sorted by (target, source)."""

    night: date
    source: Ids  # (m,)
    target: Ids  # (m,) the link source -> target endorses target
    weight: Floats | None  # (m,) finite and > 0; None when links are unweighted
    origin: Origin
    duplicates: int = 0  # rows merged into an equal link (weights added)
    self_links: int = 0  # distinct nodes with a link to themselves
    fetched: Ids | None = None  # sorted ids of sources known to have been fetched tonight; None = not known


@dataclass(frozen=True)
class Profile:
    """The measured facts of a raw snapshot: one flat row, the frame that the checks read.

    Shares are in [0, 1]; a fact that cannot be known yet (no previous night) is None.
    """

    night: date
    rows: int
    links: int
    nodes: int
    sources: int
    targets: int
    duplicates: int
    self_links: int
    dropped: int
    weight_min: float
    weight_max: float
    weight_sum: float
    longest_list: int  # largest out-degree tonight
    new_nodes: float | None  # share of tonight's nodes never seen on an accepted night
    kept: float | None  # share of the previous effective links seen again
    lost: float | None  # share of sources (>= 2 links) with none left
    hub: float | None  # share of the 100 largest sources that lost more than half
    cut: int | None  # sources with more links before than tonight's longest list and exactly that many tonight
    shrunk: float | None  # share of sources (>= 5 links) that lost > 20 %, not all
    node_ratio: float | None  # tonight's nodes / median of the trailing accepted nights
    link_ratio: float | None  # tonight's links / median of the trailing accepted nights
    history: int  # accepted nights the comparison rests on (0 = first night)
    fetch_list: bool = False  # which sources were fetched is known; then kept .. shrunk are over those sources only
    unfetched: float | None = None  # share of sources (>= 2 links) known not to have been fetched; None: no list
    # what the shares are shares of; None on a first night
    base_links: int | None = None  # of kept
    base_sources: int | None = None  # of lost
    base_hubs: int | None = None  # of hub
    base_lists: int | None = None  # of shrunk
    base_nodes: float | None = None  # of node_ratio

    @property
    def duplicate_share(self) -> float:
        """Share of the rows read that repeat a link."""
        return self.duplicates / self.rows if self.rows else 0.0

    @property
    def dropped_share(self) -> float:
        """Share of the rows read that were left out as unusable."""
        return self.dropped / self.rows if self.rows else 0.0


@dataclass(frozen=True)
class RuleResult:
    """One check of one profile."""

    rule: str
    column: str
    value: float | None
    expected: str  # "at least 0.95", in words
    severity: str  # "hold", "repair" or "note"
    ok: bool
    crashed: str = ""  # why the rule itself failed to run; then ok says nothing about the data
    own: bool = False  # a limit that the network's owner set


@dataclass(frozen=True)
class Verdict:
    """fine: scored as it is. repair: scored after carrying what is missing, marked degraded. hold: not scored."""

    outcome: str  # "fine", "repair" or "hold"
    results: tuple[RuleResult, ...]
    capped: bool = False  # lists look cut at a common length, or shrunk: cut lists are carried too
    coverage_step: bool = False  # a rise in coverage: new baseline, no node-level alerts
    reasons: tuple[str, ...] = ()  # the failed rules in plain words
    rebaselined: bool = False  # accepted after held nights that agree: new baseline, no node-level alerts

    @property
    def starts_baseline(self) -> bool:
        """Tonight is not compared node by node with what came before, and trailing facts start anew with it."""
        return self.coverage_step or self.rebaselined


@dataclass(frozen=True)
class LinkBook:
    """Every link the network is known by: in effect tonight, or seen within the memory. Sorted by (target, source).

    The effective snapshot, what is scored, is the rows with ``state < GONE``.
    """

    night: date
    source: Ids
    target: Ids
    weight: Floats | None
    state: Codes  # SEEN, CARRIED, WAITING, GONE, SHELVED
    absent: Codes  # accepted nights in a row that the link was in no snapshot; 0 when SEEN, 255 = that or more

    @property
    def in_effect(self) -> Flags:
        """(m,) which rows are scored."""
        return self.state < GONE


@dataclass(frozen=True)
class LinkChanges:
    """Links that differ between two effective snapshots, sorted by (target, source)."""

    source: Ids
    target: Ids
    kind: Codes  # NEW, RETURNED, LOST, REWEIGHTED, EXPIRED
    before: Floats  # weight before (0 when absent, 1 when unweighted)
    after: Floats
    coverage: Flags  # (k,) True where what was crawled changed, not what the network did: never alerted


@dataclass(frozen=True)
class Upkeep:
    """What the effective snapshot added to or kept from the raw one, in counts."""

    carried_links: int
    carried_sources: int
    waiting_links: int
    returned_links: int
    new_links: int
    lost_links: int
    expired_links: int
    departed: Ids  # nodes judged departed tonight (ids)
    unfetched: Ids  # sources judged or known unfetched tonight (ids)
    coverage_step: bool = False
    coverage_links: int = 0  # changed links that only tell of coverage; yesterday is compared with or without them


@dataclass(frozen=True)
class SpectralBounds:
    """lower <= lambda <= upper, proven in floating point; both exactly 0 for an acyclic network."""

    lower: float
    upper: float
    component: int = -1  # strong component that attains it; -1 when acyclic


@dataclass(frozen=True)
class Pin:
    """alpha, fixed on one night and kept over an era."""

    alpha: float
    share: float  # f: alpha = share / lambda_upper on the pin night
    night: date  # the night it was fixed
    lambda_lower: float
    lambda_upper: float


@dataclass(frozen=True)
class ScoreSet:
    """One score of one night. It exists only if it is finite and proven to its bound."""

    night: date
    score: str
    alpha: float
    ids: Ids  # (n,) sorted node ids
    value: Floats  # (n,) >= beta, in units of one node's own importance
    bound: Floats  # (n,) proven: |value - exact| <= bound
    rank: Ids  # (n,) competition rank, highest value = 1; nodes within the bounds of each other share it
    best: Ids  # (n,) best place consistent with the bounds
    worst: Ids  # (n,) worst place consistent with the bounds
    residual: float  # max |beta + alpha W'x - x| / beta
    sweeps: int


@dataclass(frozen=True)
class Moves:
    """How one score's ranks moved between two compared nights. Missing sides are NaN (values) and 0 (ranks)."""

    night: date
    previous: date
    score: str
    ids: Ids  # (k,) sorted; every node present on either night
    status: Codes  # MOVED, ARRIVED, DEPARTED
    value_before: Floats
    value_now: Floats
    rank_before: Ids
    rank_now: Ids
    octaves: Floats  # log2(rank before / rank now); + is a rise; NaN when one side is missing
    deviation: Floats  # log value ratio minus the median of its depth band; NaN when one side is missing


@dataclass(frozen=True)
class NetworkMove:
    """How the top of the ranking as a whole changed."""

    score: str
    depth: int  # places compared
    tau_b: float | None  # Kendall's tau-b on nodes in both tops; None when there is no order to compare
    overlap: float  # rank-biased overlap (Webber, Moffat, Zobel 2010), extrapolated
    turnover: float  # share of the top that was not in it before
    gap_nights: int  # nights missing between the two
    footrule: float  # places moved in the two tops, 0 = none, 1 = as much as two disjoint tops


@dataclass(frozen=True)
class Alert:
    """One thing that may need a person. Same inputs give the same key, so a re-run replaces and never duplicates."""

    key: str
    night: date
    kind: str
    node: int  # -1 for a network-level alert
    score: str  # "" when it does not belong to one score
    direction: str  # "rose", "fell", "came", "left" or ""
    rank_before: int  # 0 = none
    rank_now: int  # 0 = none
    size: float  # octaves, or the kind's own measure; orders alerts within a kind
    facts: dict[str, Any] = field(default_factory=dict)  # the numbers behind it; JSON values only


@dataclass(frozen=True)
class StageReport:
    """How one stage of a run went."""

    stage: str
    outcome: str  # "done" or "failed"
    seconds: float
    rows: int = 0
    detail: str = ""


@dataclass(frozen=True)
class RunReport:
    """Written for every run, also when a stage fails."""

    run_id: str
    network: str
    night: date
    outcome: str  # "published", "held", "refused" or "failed"
    stages: tuple[StageReport, ...]
    peak_mib: float
    code_version: str
    config_digest: str
    input_sha256: str
