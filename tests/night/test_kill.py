"""A process killed in the middle of a night leaves the old night or the new one; a re-run gives the same bytes."""

from __future__ import annotations

import signal
import subprocess
import sys
from datetime import timedelta
from pathlib import Path

import pytest
from night.support import bytes_of, digests, run_all
from tests_support import FIRST, MiniWorld, write_settings

from swaygauge.store.checkup import checkup

SCRIPT = Path(__file__).with_name("killed_night.py")
NIGHTS = 4


def _world(folder: Path) -> Path:
    folder.mkdir()
    file = write_settings(folder)
    MiniWorld().write(folder / "in", NIGHTS)
    return file


@pytest.fixture(scope="module")
def uninterrupted(tmp_path_factory: pytest.TempPathFactory) -> tuple[dict[object, str], dict[str, str]]:
    folder = tmp_path_factory.mktemp("kill") / "straight"
    work, _ = run_all(_world(folder))
    return dict(digests(work)), bytes_of(folder / "ws")


@pytest.mark.parametrize(
    ("stage", "when"),
    [("ingest", "after"), ("check", "after"), ("score", "before"), ("compare", "after"), ("publish", "after")],
)
def test_killed_and_re_run(
    tmp_path: Path, uninterrupted: tuple[dict[object, str], dict[str, str]], stage: str, when: str
) -> None:
    file = _world(tmp_path / "killed")
    fatal = FIRST + timedelta(days=2)
    ended = subprocess.run([sys.executable, str(SCRIPT), str(file), fatal.isoformat(), stage, when], check=False)
    assert ended.returncode == -signal.SIGKILL
    work, outcomes = run_all(file)
    first_due = 3 if stage == "publish" else 2
    assert [outcome.night for outcome in outcomes] == [FIRST + timedelta(days=n) for n in range(first_due, NIGHTS)]
    assert digests(work) == uninterrupted[0]
    assert bytes_of(tmp_path / "killed" / "ws") == uninterrupted[1]
    assert [finding for finding in checkup(work.store, work.network) if finding.level == "damaged"] == []
