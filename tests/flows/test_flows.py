"""The Prefect flows around the night. Few tests: what a night does is tested without Prefect."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from datetime import date, timedelta
from pathlib import Path

import pytest
from night.support import reader_of
from prefect.settings import PREFECT_FLOWS_HEARTBEAT_FREQUENCY, temporary_settings
from prefect.testing.utilities import prefect_test_harness
from tests_support import FIRST, write_night

from swaygauge.flows.backfill import backfill
from swaygauge.flows.nightly import nightly
from swaygauge.flows.stages import stage_task
from swaygauge.flows.telling import telling
from swaygauge.night import Outcome, StageResult, Work, stages, work_for

Mini = Callable[..., Path]


def day(number: int) -> date:
    return FIRST + timedelta(days=number)


@pytest.fixture(scope="module", autouse=True)
def _server() -> Iterator[None]:
    with (
        prefect_test_harness(server_startup_timeout=180),
        temporary_settings({PREFECT_FLOWS_HEARTBEAT_FREQUENCY: None}),
    ):
        yield


def test_backfill_then_nightly_runs_every_night_once_and_tells_each(mini: Mini) -> None:
    file = mini(4)
    told: list[Outcome] = []
    with telling(told.append):
        first = backfill(str(file), end=day(2))
        second = nightly(str(file))
        third = nightly(str(file))
    assert [outcome.night for outcome in first] == [day(0), day(1), day(2)]
    assert [outcome.night for outcome in second] == [day(3)]
    assert third == []
    assert told == first + second
    report = reader_of(work_for(file)).runs("mini")[0].report
    assert [stage["stage"] for stage in report["stages"]] == list(stages.STAGES)


def test_what_may_go_away_is_retried_and_bad_input_is_not(
    mini: Mini, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    file = mini(2)
    calls: list[date] = []
    real = stages.STAGES["score"]

    def busy_once(work: Work, night: date) -> StageResult:
        calls.append(night)
        if len(calls) == 1:
            raise OSError("disk busy")
        return real(work, night)

    monkeypatch.setitem(stages.STAGES, "score", busy_once)
    monkeypatch.setattr(stage_task, "retry_delay_seconds", 0)
    (tmp_path / "in" / f"links-{day(1)}.csv").write_text("source,target\na\n")
    outcomes = nightly(str(file))
    assert [outcome.outcome for outcome in outcomes] == ["published", "refused"]
    assert calls == [day(0), day(0)]


def test_a_night_run_alone_stage_by_stage_gives_the_same_as_in_one_go(mini: Mini, tmp_path: Path) -> None:
    file = mini(2)
    nightly(str(file))
    digest = work_for(file).store.night_row("mini", day(1)).digest  # type: ignore[union-attr]  # it is stored
    write_night(tmp_path / "in", day(2), {("a", "b")})
    backfill(str(file), start=day(1), end=day(1), again=True)
    assert work_for(file).store.night_row("mini", day(1)).digest == digest  # type: ignore[union-attr]  # it is stored
