from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path


def visible_state(told):
    return {key: value for key, value in told.items() if key != "names"}


def test_a_killed_run_leaves_the_old_night_or_the_new_one_and_a_re_run_gives_the_same_bytes(tmp_path):
    script = Path(__file__).with_name("kill_points.py")
    done = subprocess.run(
        [sys.executable, str(script), str(tmp_path)], capture_output=True, text=True, timeout=300, check=False
    )
    assert done.returncode == 0, done.stderr
    told = json.loads(done.stdout)
    old, new = told["old"], told["new"]
    assert told["finished"] == 0
    assert old["digest"] != new["digest"]
    assert old["damaged"] == new["damaged"] == []
    seen = [visible_state(after_kill) for after_kill in told["kills"]]
    assert len(seen) >= 40  # every step of the run was hit
    first_new = next(at for at, state in enumerate(seen) if state["digest"] == new["digest"])
    assert all(state == visible_state(old) for state in seen[:first_new])
    assert all(state == visible_state(new) for state in seen[first_new:])
    assert all(state["names"] in (old["names"], new["names"]) for state in told["kills"])  # a table of its own
    assert all(state == new for state in told["after"])
