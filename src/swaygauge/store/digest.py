"""One hash per night over everything it is made of; it takes in the previous night's, so nights form a chain."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping, Sequence
from typing import Any, Final

from swaygauge.store.rows import AlertRow, CheckRow, NightRow, PartRow, canonical_json, to_database

# Not part of what a night is: where its file lay and when, how often it was published, how things were worded.
LEFT_OUT: Final = {
    NightRow: ("input_file", "input_mtime_ns", "digest", "version"),
    PartRow: ("path",),
    AlertRow: ("node_name", "sentence"),
    CheckRow: ("expected", "crashed"),
}


def night_digest(
    row: NightRow,
    *,
    parts: Sequence[PartRow],
    facts: Mapping[str, Any],
    checks: Sequence[CheckRow],
    alerts: Sequence[AlertRow],
) -> str:
    """Hex SHA-256 over the night's row (with its basis), facts, hashes of its parts, checks and alerts.

    parts may come in any order; checks and alerts count in the order they have.
    """
    told = {
        "night": _told(row),
        "parts": sorted((_told(part) for part in parts), key=canonical_json),
        "facts": dict(facts),
        "checks": [_told(check) for check in checks],
        "alerts": [_told(alert) for alert in alerts],
    }
    return hashlib.sha256(canonical_json(told).encode()).hexdigest()


def _told(row: NightRow | PartRow | CheckRow | AlertRow) -> dict[str, Any]:
    return {name: value for name, value in to_database(row).items() if name not in LEFT_OUT[type(row)]}
