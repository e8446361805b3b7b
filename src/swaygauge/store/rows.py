"""What the catalog holds, as frozen rows of plain Python values; no array, no library.

A row travels to and from the database as text, integers and floats: nights as ISO dates, flags as 0 and 1, JSON in one
canonical form. Text that people or crawls wrote (:data:`FreeText`) is kept as a JSON string, because databases
disagree on NUL and on lone surrogates, and such text must come back exactly.
"""

from __future__ import annotations

import json
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, fields
from datetime import date
from typing import Any, Final, TypeAlias, TypeVar

from swaygauge.errors import StoreError

FreeText: TypeAlias = str

CHAINED: Final = ("published", "held")  # states of a night that the chain of digests runs through


@dataclass(frozen=True)
class NightRow:
    """One night of one network: what came in, how it was judged, what it rests on."""

    network: str
    night: date
    state: str = field(kw_only=True)  # "published", "held", "refused" or "missing"
    outcome: str = field(default="", kw_only=True)  # the verdict: "fine", "repair", "hold" or ""
    degraded: bool = field(default=False, kw_only=True)
    coverage_step: bool = field(default=False, kw_only=True)
    previous: date | None = field(default=None, kw_only=True)  # the accepted night it is compared with
    gap_nights: int = field(default=0, kw_only=True)  # expected nights missing between the two
    era: date | None = field(default=None, kw_only=True)  # the night alpha was pinned
    alpha: float | None = field(default=None, kw_only=True)
    lambda_lower: float | None = field(default=None, kw_only=True)
    lambda_upper: float | None = field(default=None, kw_only=True)
    input_file: FreeText = field(default="", kw_only=True)
    input_sha256: str = field(default="", kw_only=True)
    input_size: int = field(default=0, kw_only=True)
    input_mtime_ns: int = field(default=0, kw_only=True)  # spares hashing an unchanged file; never part of the digest
    aliases_digest: str = field(default="", kw_only=True)
    settings_digest: str = field(default="", kw_only=True)
    basis: str = field(default="", kw_only=True)  # digest of the stored (CHAINED) night before; "" on the first
    accepted: bool = field(default=False, kw_only=True)  # belongs to the history that later nights rest on
    reason: FreeText = field(default="", kw_only=True)  # why held, refused or accepted
    digest: str = field(default="", kw_only=True)  # set by publishing
    version: int = field(default=0, kw_only=True)  # counts publications; 0 = not in the store yet


@dataclass(frozen=True)
class PartRow:
    """One Parquet file of one night."""

    network: str
    night: date
    kind: str
    score: str
    path: str  # relative to the workspace
    sha256: str
    bytes: int
    rows: int


@dataclass(frozen=True)
class FactRow:
    """One small JSON document of one night."""

    network: str
    night: date
    name: str
    value: Any


@dataclass(frozen=True)
class CheckRow:
    """One check of one night's profile."""

    network: str
    night: date
    position: int
    rule: str
    column_name: str
    value: float | None
    expected: str
    severity: str
    ok: bool
    crashed: str


@dataclass(frozen=True)
class AlertRow:
    """One alert as it was raised, with the name and the sentence that were shown then."""

    network: str
    night: date
    position: int  # order within the night
    key: str
    kind: str
    node: int  # -1 for a network-level alert
    node_name: FreeText
    score: str
    direction: str
    rank_before: int
    rank_now: int
    size: float
    facts: dict[str, Any]
    sentence: FreeText


@dataclass(frozen=True)
class AcceptanceRow:
    """A person's decision to let a held night count. Never changed, never deleted."""

    network: str
    number: int
    night: date
    reason: FreeText
    who: FreeText
    at: str  # UTC


@dataclass(frozen=True)
class RunRow:
    """One run of one night."""

    run_id: str
    network: str
    night: date
    outcome: str
    started: str  # UTC
    finished: str  # UTC
    report: dict[str, Any]


@dataclass(frozen=True)
class NamePartRow:
    """One part of a network's name table: ids first .. first + rows - 1."""

    network: str
    first: int
    rows: int
    path: str
    sha256: str
    bytes: int


@dataclass(frozen=True)
class AliasRow:
    """Another name of a node. ``shown`` marks the one to print instead of the name it was first seen under."""

    network: str
    name: FreeText
    node: int
    valid_from: date
    shown: bool


Row = TypeVar("Row")


def canonical_json(value: Any) -> str:
    """One text for one value: sorted keys, no spaces, ASCII, floats by repr. Dates become ISO text.

    Raises StoreError for NaN, infinities and anything that JSON has no form for.

    >>> canonical_json({"b": 0.1, "a": (1, None)})
    '{"a":[1,null],"b":0.1}'
    """
    try:
        return json.dumps(value, sort_keys=True, separators=(",", ":"), allow_nan=False, default=_plain)
    except (TypeError, ValueError) as error:
        raise StoreError(
            f"cannot be stored as JSON: {error}. Give finite numbers, text, lists, tables or null."
        ) from None


def _plain(value: Any) -> Any:
    """Dates, and NumPy scalars and arrays without importing NumPy."""
    if isinstance(value, date):
        return value.isoformat()
    if hasattr(value, "tolist"):
        return value.tolist()
    raise TypeError(f"{type(value).__name__} {str(value)[:80]!r} has no JSON form")


def _finite(value: float | None) -> float | None:
    if value is not None and not math.isfinite(value):
        raise StoreError(f"a number of the catalog must be finite, got {value!r}")
    return None if value is None else float(value)


def _maybe(convert: Callable[[Any], Any]) -> Callable[[Any], Any]:
    return lambda value: None if value is None else convert(value)


def _same(value: Any) -> Any:
    return value


# by the declared type of a field: how it goes into the database, how it comes back
_FORMS: Final[dict[str, tuple[Callable[[Any], Any], Callable[[Any], Any]]]] = {
    "str": (_same, _same),
    "int": (int, _same),
    "bool": (int, bool),
    "float": (_finite, float),
    "float | None": (_finite, _maybe(float)),
    "date": (date.isoformat, date.fromisoformat),
    "date | None": (_maybe(date.isoformat), _maybe(date.fromisoformat)),
    "FreeText": (canonical_json, json.loads),
    "Any": (canonical_json, json.loads),
    "dict[str, Any]": (canonical_json, json.loads),
}


def columns(cls: type[Any]) -> tuple[str, ...]:
    """The columns of a row type, in the order of its fields."""
    return tuple(item.name for item in fields(cls))


def to_database(row: Any) -> dict[str, Any]:
    """A row as the values the database holds."""
    return {item.name: _FORMS[str(item.type)][0](getattr(row, item.name)) for item in fields(row)}


def from_database(cls: type[Row], values: Sequence[Any]) -> Row:
    """A row from database values in the order of :func:`columns`."""
    told = fields(cls)  # type: ignore[arg-type]  # every row type is a dataclass; TypeVar bounds cannot say so
    return cls(**{item.name: _FORMS[str(item.type)][1](value) for item, value in zip(told, values, strict=True)})
