"""What a stage and a run have to say."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date


@dataclass(frozen=True)
class StageResult:
    """One stage of one night, for the run report."""

    rows: int
    detail: str


@dataclass(frozen=True)
class Outcome:
    """One night of a run, or a file that could not be a night (then night is None)."""

    night: date | None
    outcome: str  # "published", "held", "refused", "failed", "unclear" or "overdue"
    why: str  # why it was run
    detail: str  # verdict and alerts in words, or the error
    seconds: float = 0.0
