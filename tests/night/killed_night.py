"""Run what is due, and die by SIGKILL at the end of one stage of one night. Started by test_kill.py."""

from __future__ import annotations

import os
import signal
import sys
from datetime import date
from pathlib import Path

from swaygauge.night import StageResult, Work, run_due, stages, work_for


def main(file: str, night: str, stage: str, when: str) -> None:
    fatal = date.fromisoformat(night)
    real = stages.STAGES[stage]

    def deadly(work: Work, night: date) -> StageResult:
        if night == fatal and when == "before":
            os.kill(os.getpid(), signal.SIGKILL)
        result = real(work, night)
        if night == fatal:
            os.kill(os.getpid(), signal.SIGKILL)
        return result

    stages.STAGES[stage] = deadly
    run_due(work_for(Path(file)))


if __name__ == "__main__":
    main(*sys.argv[1:])
