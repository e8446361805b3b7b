"""Run the parts of one kernel on several threads."""

from __future__ import annotations

import os
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from typing import Any

import numpy as np

from swaygauge.records import Ints

CHUNKS = 64  # row chunks of one sweep; fixed, so that totals are added in the same order for any number of threads
SMALL = 100_000  # links below which a sweep (about 50 microseconds) is over before a second thread has started


class _Crew:
    """How many threads work, and the pool of the current process."""

    def __init__(self) -> None:
        self.size = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
        self.pool: ThreadPoolExecutor | None = None
        self.process = 0

    def helpers(self) -> ThreadPoolExecutor:
        """The pool; a forked child, whose copy has no threads, gets its own."""
        if self.pool is None or self.process != os.getpid():
            self.pool = ThreadPoolExecutor(max_workers=self.size, thread_name_prefix="swaygauge")
            self.process = os.getpid()
        return self.pool


_CREW = _Crew()


def thread_count() -> int:
    """How many threads sweeps may use."""
    return _CREW.size


def use_threads(count: int) -> int:
    """Set how many threads sweeps may use (at least 1); returns the previous number. Results do not depend on it."""
    before = _CREW.size
    if count < 1:
        raise ValueError(f"expected at least 1 thread, got {count}.")
    _CREW.size, _CREW.pool = count, None
    return before


def cut_rows(start: Ints, stop: Ints) -> Ints:
    """Bounds of row chunks of about equal work; rows are [start[i], stop[i]). One chunk when the work is small."""
    rows = len(stop)
    work = np.cumsum(stop - start + 4)
    if rows == 0 or work[-1] < SMALL:
        return np.array([0, rows], np.int64)
    cuts = np.searchsorted(work, np.linspace(0, work[-1], CHUNKS + 1)[1:-1])
    return np.concatenate(([0], cuts, [rows])).astype(np.int64)


def in_parts(kernel: Callable[..., Any], cuts: Ints, *args: Any) -> None:
    """kernel(part, parts, cuts, *args) for every part, the first one in this thread."""
    parts = min(_CREW.size, len(cuts) - 1)
    if parts <= 1:
        kernel(0, 1, cuts, *args)
        return
    waiting = [_CREW.helpers().submit(kernel, part, parts, cuts, *args) for part in range(1, parts)]
    try:
        kernel(0, parts, cuts, *args)
    finally:
        for part in waiting:
            part.result()
