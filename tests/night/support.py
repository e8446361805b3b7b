"""Running nights in tests, and looking at what they left."""

from __future__ import annotations

import hashlib
from datetime import date
from pathlib import Path

from swaygauge.night import Outcome, Work, run_due, work_for
from swaygauge.store import Reader


def run_all(file: Path, **options: object) -> tuple[Work, list[Outcome]]:
    """Run what is due."""
    work = work_for(file)
    return work, run_due(work, **options)  # type: ignore[arg-type]  # options are passed through as given


def digests(work: Work) -> dict[date, str]:
    """The digest of every stored night: equal digests mean equal parts, facts and alerts."""
    return {row.night: row.digest for row in work.store.nights(work.network)}


def bytes_of(workspace: Path) -> dict[str, str]:
    """SHA-256 of every Parquet file in the workspace."""
    return {
        str(path.relative_to(workspace)): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(workspace.rglob("*.parquet"))
    }


def reader_of(work: Work) -> Reader:
    """The stored nights, as the terminal reads them."""
    return Reader.open(work.store.workspace)
