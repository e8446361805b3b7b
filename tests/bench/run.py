"""The speed of the scoring core beside the libraries a user would otherwise pick: ``python tests/bench/run.py``.

Makes networks, measures one library per process, prints two tables (every measurement; the ratios that must hold, at
the largest size) and writes them to --out. Exits 1 when a ratio that must hold does not. Peers that are not installed
(pip install 'swaygauge[bench]') are left out and named, and the ratios that need them count as not measured.
"""

from __future__ import annotations

import argparse
import json
import platform
import subprocess
import sys
import tempfile
from collections.abc import Callable
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE))

from networks import communities, web  # noqa: E402  (a script beside its modules, not a package)

PEERS = ("igraph", "networkit", "scipy_bicgstab", "scipy_power", "scikit_network", "networkx")
SMALL_ONLY = {"networkx": 1_000_000, "scikit_network": 20_000_000}
Told = dict[str, Any]


@dataclass(frozen=True)
class Must:
    """A ratio that has to reach (or stay below) a limit. ``measure`` raises KeyError for what was not measured."""

    name: str
    limit: float
    aim: float
    at_least: bool
    measure: Callable[[Told, Told], float]

    def holds(self, value: float) -> bool:
        return value >= self.limit if self.at_least else value <= self.limit


def _against(peer: str, score: str) -> Callable[[Told, Told], float]:
    return lambda told, _: told[peer][score]["solve"] / told["ours"][score]["solve"]


MUSTS = (
    Must("katz .85, NetworKit / ours", 60, 75, True, _against("networkit", "katz 0.85")),
    Must("katz .85, SciPy BiCGSTAB / ours", 3, 6, True, _against("scipy_bicgstab", "katz 0.85")),
    Must("katz .85, SciPy power / ours", 25, 50, True, _against("scipy_power", "katz 0.85")),
    Must("fairshare, igraph / ours", 6, 12, True, _against("igraph", "fairshare")),
    Must(
        "fairshare with construction, igraph / ours",
        8,
        10,
        True,
        lambda told, _: (
            (told["igraph"]["build"] + told["igraph"]["fairshare"]["solve"])
            / (told["ours"]["build"] + told["ours"]["fairshare"]["solve"])
        ),
    ),
    Must(
        "memory, igraph / ours",
        7,
        8,
        True,
        lambda told, _: told["igraph"]["bytes per link"] / told["ours"]["bytes per link"],
    ),
    Must("fairshare, NetworKit / ours", 50, 60, True, _against("networkit", "fairshare")),
    Must(
        "katz .99 / katz .5",
        1.5,
        1.2,
        False,
        lambda told, _: told["ours"]["katz 0.99"]["solve"] / told["ours"]["katz 0.5"]["solve"],
    ),
    Must(
        "katz .99 / katz .5, communities",
        3,
        2,
        False,
        lambda _, told: told["ours"]["katz 0.99"]["solve"] / told["ours"]["katz 0.5"]["solve"],
    ),
    Must(
        "lambda to 1e-6, in katz .85 solves",
        2,
        1,
        False,
        lambda told, _: told["ours"]["lambda"]["solve"] / told["ours"]["katz 0.85"]["solve"],
    ),
    Must(
        "lambda to 1e-6, in katz .85 solves, communities",
        2,
        1,
        False,
        lambda _, told: told["ours"]["lambda"]["solve"] / told["ours"]["katz 0.85"]["solve"],
    ),
    Must(
        "certificate, in katz .85 solves",
        0.5,
        0.1,
        False,
        lambda told, _: told["ours"]["katz 0.85"]["proof"] / told["ours"]["katz 0.85"]["solve"],
    ),
    Must(
        "neighbouring places proven apart or tied", 0.95, 0.97, True, lambda told, _: told["ours"]["katz 0.85"]["apart"]
    ),
    Must("bytes per link, construction and solve", 24, 24, False, lambda told, _: told["ours"]["bytes per link"]),
)


def measure(task: str, folder: Path, repeats: int) -> Told:
    """One task in a process of its own."""
    command = [sys.executable, str(HERE / "tasks.py"), task, str(folder), str(repeats)]
    done = subprocess.run(command, capture_output=True, text=True)
    if done.returncode:
        return {"missing": done.stderr.strip().splitlines()[-1]}
    told: Told = json.loads(done.stdout)
    return told


def measured(name: str, links: int, peers: tuple[str, ...], repeats: int) -> Told:
    """Everything about one network."""
    made = web(links) if name == "web" else communities(links)
    with tempfile.TemporaryDirectory() as place:
        folder = Path(place)
        np.savez(folder / "links.npz", n=made.n, source=made.source, target=made.target)
        told = {}
        for task in ("reference", "ours", *peers):
            if links <= SMALL_ONLY.get(task, links):
                print(f"  {name}, {links:,} links: {task}", file=sys.stderr, flush=True)
                told[task] = measure(task, folder, repeats)
    return told


def rows_of(name: str, links: int, told: Told) -> list[str]:
    """Table rows: one per library and score."""
    rows = []
    for task, result in told.items():
        if "missing" in result:
            rows.append(f"| {name} | {links:,} | {task} | not measured: {result['missing']} | | | | |")
        for score, item in result.items():
            if isinstance(item, dict):
                proof, error = item.get("proof"), item.get("error", item.get("width"))
                rows.append(
                    f"| {name} | {links:,} | {task} | {score} | {result['build']:.3f} | {item['solve']:.4f}"
                    f"{f' + {proof:.4f}' if proof else ''} | {error:.1e} | {result['bytes per link']:.1f} |"
                )
    return rows


def judged(told: Told, clustered: Told) -> tuple[list[str], bool]:
    """Table rows of the ratios, and whether all hold."""
    rows, fine = [], True
    for must in MUSTS:
        try:
            value = must.measure(told, clustered)
            held = must.holds(value)
            outcome = "yes" if held else "MISSED"
        except (KeyError, ZeroDivisionError):
            value, held, outcome = float("nan"), False, "not measured"
        fine = fine and held
        rows.append(f"| {must.name} | {value:.3g} | {must.limit:g} | {must.aim:g} | {outcome} |")
    return rows, fine


def bandwidth() -> float:
    """Bytes per second that one thread reads from a large array."""
    import time

    array = np.ones(30_000_000)
    best = float("inf")
    for _ in range(5):
        start = time.perf_counter()
        array.sum()
        best = min(best, time.perf_counter() - start)
    return array.nbytes / best


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--links", type=float, nargs="+", default=[1e5, 1e6, 1e7], help="sizes, smallest first")
    parser.add_argument("--large", action="store_true", help="also 5e7 links")
    parser.add_argument("--repeats", type=int, default=5)
    parser.add_argument("--peers", nargs="*", default=list(PEERS), choices=PEERS)
    parser.add_argument("--out", type=Path, default=Path("bench-results.md"))
    given = parser.parse_args()
    sizes = [int(size) for size in given.links] + ([50_000_000] if given.large else [])
    rows: list[str] = []
    told: Told = {}
    for links in sizes:
        told = measured("web", links, tuple(given.peers), given.repeats)
        rows += rows_of("web", links, told)
    clustered = measured("communities", sizes[-1], (), given.repeats)
    rows += rows_of("communities", sizes[-1], clustered)
    ratios, fine = judged(told, clustered)
    sweep = told["ours"]["katz 0.85"]["solve"] / told["ours"]["katz 0.85"]["sweeps"]
    text = "\n".join(
        [
            f"# Scoring core, {date.today()}, {platform.machine()}, Python {platform.python_version()}",
            "",
            "| network | links | library | score | construction s | solve s (+ proof) | error | bytes per link |",
            "|---|---|---|---|---|---|---|---|",
            *rows,
            "",
            f"One sweep at {sizes[-1]:,} links: {1e3 * sweep:.2f} ms, "
            f"{told['ours']['links per sweep'] / sweep / 1e6:.0f} million links per second; "
            f"one thread reads {bandwidth() / 1e9:.1f} GB/s in order.",
            "",
            "| ratio | measured | must | aim | holds |",
            "|---|---|---|---|---|",
            *ratios,
            "",
        ]
    )
    given.out.parent.mkdir(parents=True, exist_ok=True)
    given.out.write_text(text)
    print(text)
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
