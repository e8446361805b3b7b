"""The nightly flow: every dated snapshot that is not yet published, in date order.

State decides what runs, not the schedule: a night that was missed, a file that came late or was replaced, an alias or
an acceptance that was added, are all found by comparing the snapshot folder with the catalog.
"""

# no postponed annotations here: a served run resolves the parameter types without this module's names
from datetime import UTC, date, datetime
from pathlib import Path

from prefect import flow

from swaygauge.flows.stages import stage_task
from swaygauge.flows.telling import tell
from swaygauge.night import Outcome, StageResult, run_due, work_for


@flow(name="nightly", flow_run_name="nightly {config}", persist_result=False)
def nightly(config: str, only: date | None = None) -> list[Outcome]:
    """Run what is due for one network, a task per stage.

    config: path of the network's TOML file. only: restrict to this night and what must be replayed after it.
    """
    work = work_for(Path(config))

    def as_task(night: date, stage: str) -> StageResult:
        return stage_task(config, night, stage)

    return run_due(work, start=only, now=datetime.now(UTC), call=as_task, tell=tell)
