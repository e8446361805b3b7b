"""Stored points laid on the calendar, so that a missing night leaves a gap."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import timedelta
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from swaygauge.store.views import TracePoint


def on_calendar(points: Sequence[TracePoint], every_nights: int) -> list[TracePoint | None]:
    """One entry per expected night from the first point to the last; None where nothing is stored."""
    if not points:
        return []
    by_night = {point.night: point for point in points}
    laid: list[TracePoint | None] = []
    night = points[0].night
    while night <= points[-1].night:
        laid.append(by_night.pop(night, None))
        night += timedelta(days=every_nights)
    # nights off the cadence are kept, at the end of the step they fall in, rather than lost
    return laid if not by_night else list(points)
