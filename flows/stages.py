"""The coarse tasks that the flows are made of. Parameters are names and dates."""

from __future__ import annotations

from datetime import date
from pathlib import Path
from typing import Any, Final

from prefect import task
from prefect.tasks import exponential_backoff

from swaygauge.night import StageResult, is_transient, run_night, run_stage, work_for
from swaygauge.records import RunReport


def _worth_retrying(_task: Any, _run: Any, state: Any) -> bool:
    """Only what may go away by itself: a busy disk or catalog, never bad input or bad settings."""
    try:
        state.result()
    except Exception as error:
        return is_transient(error)
    return False


RETRYING: Final[dict[str, Any]] = {
    "retries": 3,
    "retry_delay_seconds": exponential_backoff(backoff_factor=2),
    "retry_jitter_factor": 0.5,
    "retry_condition_fn": _worth_retrying,
    "persist_result": False,
}


@task(name="stage", task_run_name="{stage} {night}", **RETRYING)
def stage_task(config: str, night: date, stage: str) -> StageResult:
    """One stage of one night: load from the store, compute, save to the store."""
    return run_stage(work_for(Path(config)), night, stage)


@task(name="replay", task_run_name="replay {night}", **RETRYING)
def replay_task(config: str, night: date) -> RunReport:
    """All stages of one historical night."""
    return run_night(work_for(Path(config)), night)
