"""Kill a run at every point where it could leave something half done, and tell what was found afterwards.

A child re-runs the second of three nights with other input. Each place where bytes reach a file or the catalog
(fsync, rename, insert, delete, commit) is a point; child k is killed with SIGKILL at its k-th point.
Called by test_kill.py with an empty folder; prints one JSON document. A kill does not lose what the kernel has, so
nothing is forced to disk here.
"""

from __future__ import annotations

import json
import os
import shutil
import signal
import sys
from pathlib import Path

from example_nights import NET, first_nights, run_night

from swaygauge.store import Store, catalog, files, names, publishing, queries, staging
from swaygauge.store.checkup import checkup

NIGHTS = first_nights(3)
REDONE = NIGHTS[1]


def arm(point: int) -> None:
    """Let this process kill itself at its ``point``-th step."""
    steps = 0

    def step() -> None:
        nonlocal steps
        steps += 1
        if steps == point:
            os.kill(os.getpid(), signal.SIGKILL)

    def before(function):
        def stepped(*args, **options):
            step()
            return function(*args, **options)

        return stepped

    os.fsync = before(os.fsync)
    Path.replace = before(Path.replace)
    for module in (catalog, names, publishing, staging):
        for name in ("insert_rows", "delete_rows"):
            if hasattr(module, name):
                setattr(module, name, before(getattr(module, name)))
    real = catalog.sa.Connection._commit_impl
    catalog.sa.Connection._commit_impl = before(real)


def redo(workspace: Path) -> None:
    """The night again, with other scores and two more nodes (so names are appended too)."""
    with Store.open(workspace) as store, store.lock(NET):
        run_night(store, REDONE, nodes=52, seed=1)


def state(workspace: Path) -> dict[str, object]:
    """What a reader sees of the night, and whether the workspace is sound."""
    with Store.open(workspace) as store, store.lock(NET):
        parts = queries.parts(store.catalog.ask, NET, REDONE)
        row = store.night_row(NET, REDONE)
        return {
            "digest": row.digest,
            "parts": {part.path: files.sha256_of((workspace / part.path).read_bytes()) for part in parts},
            "facts": queries.facts(store.catalog.ask, NET, REDONE),
            "alerts": [alert.key for alert in queries.alerts(store.catalog.ask, NET, first=REDONE, last=REDONE)],
            "names": store.names(NET).texts(range(len(store.names(NET)))),
            "damaged": [finding.what for finding in checkup(store, NET) if finding.level == "damaged"],
        }


def child(workspace: Path, point: int) -> int:
    """Run the night in a process of its own; its wait status."""
    pid = os.fork()
    if pid == 0:
        try:
            arm(point)
            redo(workspace)
            files.sync_folder(workspace)  # the last point: all is done, nothing is closed
        except BaseException:
            os._exit(1)
        os._exit(0)
    return os.waitpid(pid, 0)[1]


def main(folder: Path) -> None:
    os.fsync = lambda handle: None
    catalog.PRAGMAS = (*catalog.PRAGMAS, "synchronous=OFF")
    with Store.open(folder / "start") as store:
        for night in NIGHTS:
            run_night(store, night)
    shutil.copytree(folder / "start", folder / "whole")
    redo(folder / "whole")
    told = {"old": state(folder / "start"), "new": state(folder / "whole"), "kills": [], "after": []}
    point = 1
    while True:
        workspace = folder / f"killed-{point}"
        shutil.copytree(folder / "start", workspace)
        status = child(workspace, point)
        if not (os.WIFSIGNALED(status) and os.WTERMSIG(status) == signal.SIGKILL):
            told["finished"] = status
            break
        told["kills"].append(state(workspace))
        redo(workspace)
        told["after"].append(state(workspace))
        shutil.rmtree(workspace)
        point += 1
    print(json.dumps(told))


if __name__ == "__main__":
    main(Path(sys.argv[1]))
