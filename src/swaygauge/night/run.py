"""Running a night, or all nights that are due, with a report of every run."""

from __future__ import annotations

import resource
import time
import uuid
from collections.abc import Callable
from datetime import UTC, date, datetime

from swaygauge import __version__
from swaygauge.errors import Busy, InputError
from swaygauge.night.publish import refuse
from swaygauge.night.result import Outcome, StageResult
from swaygauge.night.stages import STAGES, run_stage
from swaygauge.night.work import Due, Work, due_nights, overdue_nights
from swaygauge.records import RunReport, StageReport
from swaygauge.store.rows import NightRow

Call = Callable[[date, str], StageResult]


def is_transient(error: BaseException) -> bool:
    """May the same call work a moment later? True for a busy store or disk; never for bad input or settings."""
    return isinstance(error, Busy) or (isinstance(error, OSError) and not isinstance(error, FileNotFoundError))


def _peak_mib() -> float:
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def _outcome_of(work: Work, night: date) -> str:
    row = work.store.night_row(work.network, night)
    return row.state if row else "failed"


def run_night(work: Work, night: date, *, call: Call | None = None) -> RunReport:
    """All stages of one night. A report is stored whatever happens.

    call: how a stage is run (the flows pass a task); default: run_stage in this process.
    Raises what a stage raises, except InputError: then the night is noted as refused and the report says why.
    """
    do: Call = call or (lambda night, stage: run_stage(work, night, stage))
    started = datetime.now(UTC)
    reports: list[StageReport] = []
    outcome, sha = "failed", ""
    work.store.clear_staging(work.network, night)
    try:
        for stage in STAGES:
            clock = time.perf_counter()
            try:
                done = do(night, stage)
            except Exception as error:
                reports.append(StageReport(stage, "failed", time.perf_counter() - clock, detail=str(error)))
                if not isinstance(error, InputError):
                    raise
                refuse(work, night, str(error))
                outcome = "refused"
                break
            reports.append(StageReport(stage, "done", time.perf_counter() - clock, done.rows, done.detail))
        else:
            row = work.store.night_row(work.network, night)
            assert row is not None
            outcome, sha = row.state, row.input_sha256
    finally:
        report = RunReport(
            run_id=uuid.uuid4().hex,
            network=work.network,
            night=night,
            outcome=outcome,
            stages=tuple(reports),
            peak_mib=round(_peak_mib(), 1),
            code_version=__version__,
            config_digest=work.settings.digest(),
            input_sha256=sha,
        )
        work.store.record_run(report, started=started, finished=datetime.now(UTC))
    return report


def _note_overdue(work: Work, now: datetime) -> list[Outcome]:
    noted = []
    for night in overdue_nights(work, now):
        why = f"no snapshot for {night}, expected by {work.settings.snapshots.deadline} UTC the day after"
        row = work.store.night_row(work.network, night)
        if row is None:
            work.store.publish(NightRow(work.network, night, state="missing", reason=why))
        noted.append(Outcome(night, "overdue", "its deadline has passed", why))
    return noted


def run_due(
    work: Work,
    *,
    start: date | None = None,
    end: date | None = None,
    again: bool = False,
    now: datetime | None = None,
    call: Call | None = None,
    whole: Callable[[date], RunReport] | None = None,
    tell: Callable[[Outcome], None] | None = None,
) -> list[Outcome]:
    """Every night that is due, in date order, under the network's lock.

    start, end: only nights from start to end. again: also nights that are stored as they would be now.
    now: also note nights whose deadline has passed by then. call: how a stage is run; whole: how a night is run
    (one of them at most). tell: called with each outcome as it happens.
    Raises Busy when another run holds the network; whatever a stage raises other than InputError ends the run.
    """
    outcomes: list[Outcome] = []

    def note(outcome: Outcome) -> None:
        outcomes.append(outcome)
        if tell:
            tell(outcome)

    with work.store.lock(work.network):
        work.store.sweep(work.network)
        for due in due_nights(work, start=start, end=end, again=again):
            if not isinstance(due, Due):
                note(Outcome(None, "unclear", "", str(due)))
                continue
            clock = time.perf_counter()
            report = whole(due.night) if whole else run_night(work, due.night, call=call)
            detail = report.stages[-1].detail
            note(Outcome(due.night, report.outcome, due.why, detail, time.perf_counter() - clock))
        for outcome in _note_overdue(work, now) if now else ():
            note(outcome)
    return outcomes
