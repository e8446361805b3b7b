"""One night as plain functions: stages that load from the store, compute, and save. No Prefect here."""

from swaygauge.night.result import Outcome, StageResult
from swaygauge.night.run import is_transient, run_due, run_night
from swaygauge.night.stages import STAGES, run_stage
from swaygauge.night.work import Work, work_for

__all__ = ["STAGES", "Outcome", "StageResult", "Work", "is_transient", "run_due", "run_night", "run_stage", "work_for"]
