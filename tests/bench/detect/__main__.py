"""Run the benchmark: python -m bench.detect [--short] [--seeds design|report] [--out FILE]."""

from __future__ import annotations

import argparse
import json
import multiprocessing
import os
import sys
import time
from collections.abc import Iterator, Sequence
from dataclasses import asdict
from pathlib import Path

from bench.detect.plans import Plan, plans
from bench.detect.series import SeriesSeen, run_timed
from bench.detect.table import Row, details, markdown, rows


def run_all(chosen: Sequence[Plan], workers: int) -> Iterator[SeriesSeen]:
    """Every series, as they finish."""
    if workers == 1:
        yield from map(run_timed, chosen)
        return
    with multiprocessing.get_context("spawn").Pool(workers) as pool:
        yield from pool.imap_unordered(run_timed, chosen)


def main() -> int:
    """Exit code 0, or 1 when a must is missed."""
    parser = argparse.ArgumentParser(prog="bench.detect", description=__doc__)
    parser.add_argument("--short", action="store_true", help="one network, two minutes; no verdict on most musts")
    parser.add_argument("--seeds", choices=("design", "report"), default="report")
    parser.add_argument("--workers", type=int, default=min(2, os.cpu_count() or 1))
    parser.add_argument("--out", type=Path, default=Path("build/bench-detect.md"), help="a .json is written beside it")
    parser.add_argument("--only", default="", help="run only series whose name holds this; nothing is judged")
    given = parser.parse_args()

    chosen = [plan for plan in plans(given.seeds, short=given.short) if given.only in plan.name]
    start = time.perf_counter()
    done: dict[Plan, SeriesSeen] = {}
    # the first series twice, for the row on re-runs
    for seen in run_all([*chosen, chosen[0]], given.workers):
        print(f"{time.perf_counter() - start:6.0f} s  {seen.plan.name} ({seen.seconds:.0f} s)", file=sys.stderr)
        if seen.plan in done:
            again = seen.digest == done[seen.plan].digest
        done[seen.plan] = seen
    series = [done[plan] for plan in chosen]
    table = rows(series, rerun_same=again)
    minutes = (time.perf_counter() - start) / 60
    form = "short form" if given.short else "whole"
    how = f"{form}, {given.seeds} seeds, {len(chosen)} series, {minutes:.1f} minutes, {given.workers} workers"
    head = f"# Detection against planted truth\n\n{how}\n"
    print(f"{head}\n{markdown(table)}")
    write(given.out, head, table, series)
    missed = [row for row in table if row.state == "MISSED"]
    print(f"\n{len(missed)} musts missed; every event is in {given.out}")
    return 1 if missed and not given.only else 0


def write(out: Path, head: str, table: Sequence[Row], series: Sequence[SeriesSeen]) -> None:
    """The table and the lists, for reading and for programs."""
    out.parent.mkdir(parents=True, exist_ok=True)
    out.write_text(f"{head}\n{markdown(table)}\n\n{details(series)}\n", encoding="utf-8")
    content = {"table": [asdict(row) | {"state": row.state} for row in table], "series": [asdict(s) for s in series]}
    out.with_suffix(".json").write_text(json.dumps(content, indent=1), encoding="utf-8")


if __name__ == "__main__":
    sys.exit(main())
