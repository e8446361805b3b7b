"""Backfill: a range of historical nights in date order, one task a night, resumable by running it again."""

# no postponed annotations here: a served run resolves the parameter types without this module's names
from datetime import date
from pathlib import Path

from prefect import flow

from swaygauge.flows.stages import replay_task
from swaygauge.flows.telling import tell
from swaygauge.night import Outcome, run_due, work_for
from swaygauge.records import RunReport


@flow(name="backfill", flow_run_name="backfill {config}", persist_result=False)
def backfill(config: str, start: date | None = None, end: date | None = None, again: bool = False) -> list[Outcome]:
    """Replay the nights from start to end (both included; None = open) that are not yet published as they would be now.

    again: also nights that are already published; their parts are replaced exactly.
    """
    work = work_for(Path(config))

    def as_task(night: date) -> RunReport:
        return replay_task(config, night)

    return run_due(work, start=start, end=end, again=again, whole=as_task, tell=tell)
