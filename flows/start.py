"""Starting a flow from the command line, in this process, and telling each night as it is done."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from datetime import date
from pathlib import Path

from prefect.settings import PREFECT_FLOWS_HEARTBEAT_FREQUENCY, temporary_settings

from swaygauge.flows.backfill import backfill
from swaygauge.flows.nightly import nightly
from swaygauge.flows.telling import telling
from swaygauge.night import Outcome

Tell = Callable[[Outcome], None] | None


@contextmanager
def _in_this_process(tell: Tell) -> Iterator[None]:
    # a flow that a person waits for needs no heartbeat, whose thread costs a second at the end of each run
    with temporary_settings({PREFECT_FLOWS_HEARTBEAT_FREQUENCY: None}), telling(tell):
        yield


def run_nightly(file: Path, start: date | None, tell: Tell) -> list[Outcome]:
    """The nightly flow, here and now. Raises what a night raises."""
    with _in_this_process(tell):
        return nightly(str(file), start)


def run_backfill(file: Path, start: date | None, end: date | None, *, again: bool, tell: Tell) -> list[Outcome]:
    """The backfill flow, here and now. Raises what a night raises."""
    with _in_this_process(tell):
        return backfill(str(file), start, end, again)
