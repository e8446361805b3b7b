"""What the reading side answers with: frozen rows of plain Python values. Names are raw: show them by ``visible``."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from typing import Any

from swaygauge.store.rows import AlertRow, CheckRow, NightRow


@dataclass(frozen=True)
class NightView:
    """Everything the catalog holds of one night."""

    row: NightRow
    facts: dict[str, Any]
    checks: tuple[CheckRow, ...]
    alerts: tuple[AlertRow, ...]


@dataclass(frozen=True)
class StandingRow:
    """One place of a night's ranking, and where the node stood on the night it is compared with."""

    rank: int
    best: int
    worst: int
    node: int
    name: str
    value: float
    bound: float  # |value - exact| <= bound, proven
    rank_before: int | None  # None: not present before, or no comparison was made
    octaves: float | None  # log2(rank before / rank); + is a rise


@dataclass(frozen=True)
class MoveRow:
    """How one node moved between a night and the one it is compared with. Missing sides are None."""

    node: int
    name: str
    direction: str  # "rose", "fell", "came", "left" or ""
    rank_before: int | None
    rank_now: int | None
    value_before: float | None
    value_now: float | None
    octaves: float | None
    deviation: float | None


@dataclass(frozen=True)
class NodeMatch:
    """A node that answers to a text."""

    node: int
    name: str  # the name to show
    first_seen: date
    how: str  # "name", "alias" or "close"


@dataclass(frozen=True)
class TracePoint:
    """One stored night in the life of a node; rank and value are None when it was not scored or not there."""

    night: date
    state: str
    degraded: bool
    rank: int | None
    best: int | None
    worst: int | None
    value: float | None
    bound: float | None


@dataclass(frozen=True)
class Finding:
    """Something that is not as it should be in a workspace."""

    level: str  # "damaged": stored data is wrong; "stale": rests on a night that has changed; "note": harmless
    night: date | None
    what: str
    todo: str
