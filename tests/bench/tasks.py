"""One measurement in one process: ``python tasks.py TASK FOLDER`` prints one JSON line.

FOLDER holds links.npz (n, source, target) and, once ``reference`` has run, reference.npz. Every task says how long the
construction took, how long the solve took (median), how far its values are from the reference, and by how much the
peak memory grew beyond the loaded links. Peers run as their manuals say, with two threads where they have threads.
"""

from __future__ import annotations

import json
import resource
import statistics
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

DAMPING = 0.85
Result = dict[str, Any]


class Bench:
    """The links, the reference, and a stop-watch."""

    def __init__(self, folder: Path, repeats: int) -> None:
        self.folder, self.repeats = folder, repeats
        with np.load(folder / "links.npz") as links:
            self.n, self.source, self.target = int(links["n"]), links["source"], links["target"]
        self.known: dict[str, Any] = {}
        if (folder / "reference.npz").exists():
            with np.load(folder / "reference.npz") as known:
                self.known = {name: known[name] for name in known.files}

    def timed(self, call: Callable[[], Any], repeats: int | None = None) -> tuple[Any, float]:
        seconds = []
        value = None
        for _ in range(repeats or self.repeats):
            del value  # its memory is not part of the next run's
            start = time.perf_counter()
            value = call()
            seconds.append(time.perf_counter() - start)
        return value, statistics.median(seconds)

    def alpha(self, share: str) -> float:
        return float(share) / float(self.known["lambda_upper"])

    def katz_error(self, share: str, values: Any, *, twice: bool = False) -> float:
        """Largest relative error; some peers scale their vector, one returns 2 x - 1 (scaled)."""
        exact = self.known[f"katz {share}"]
        exact = 2 * exact - 1 if twice else exact
        quotient = np.asarray(values) / exact
        return float(np.abs(quotient / np.median(quotient) - 1).max())

    def pagerank_error(self, values: Any) -> float:
        """Sum of absolute errors of the values divided by their sum."""
        exact = self.known["fairshare"] / self.known["fairshare"].sum()
        return float(np.abs(np.asarray(values) / np.sum(values) - exact).sum())


def ours(bench: Bench) -> Result:
    """swaygauge: construction, bracket, every score with its proof."""
    from swaygauge.graph import Graph
    from swaygauge.scores.affine import plain_problem, shared_problem
    from swaygauge.scores.proof import prove
    from swaygauge.scores.solve import solve
    from swaygauge.scores.spectrum import _find_brackets

    graph, build = bench.timed(lambda: Graph(bench.n, bench.source, bench.target), min(3, bench.repeats))
    brackets, bracket = bench.timed(lambda: _find_brackets(graph.rows, 1e-6))
    one = np.ones(bench.n)
    told: Result = {"build": build, "lambda": {"solve": bracket}, "threads": 2}
    upper, lower = float(brackets.upper.max()), float(brackets.lower.max())
    told["lambda"]["width"] = (upper - lower) / lower
    problems = {f"katz {share}": plain_problem(graph, bench.alpha(share)) for share in ("0.5", "0.85", "0.99")}
    for name, problem in (problems | {"fairshare": shared_problem(graph, DAMPING)}).items():
        h = one * problem.system.scale if len(problem.system.scale) else one
        tolerance = 1e-10 if name != "fairshare" else 1e-9
        solved, seconds = bench.timed(lambda p=problem, h=h, t=tolerance: solve(p.system, h, tolerance=t))
        proof, proving = bench.timed(
            lambda p=problem, s=solved: prove(p.system, s, one, p.strength, legal=lambda: False)
        )
        value = proof.x[graph.place]
        error = bench.pagerank_error(value) if name == "fairshare" else bench.katz_error(name[5:], value)
        told[name] = {"solve": seconds, "proof": proving, "sweeps": solved.sweeps, "error": error}
        told[name]["apart"] = _apart(proof.x, proof.bound)
    block = max((graph.rows.block(int(c)) for c in brackets.component), key=lambda b: b.high - b.low)
    inner = int((graph.rows.start[block.low + 1 : block.high + 1] - block.inner).sum())
    told["links per sweep"] = inner
    return told


def _apart(x: Any, bound: Any) -> float:
    """Share of neighbouring places above beta that are proven apart or of exactly the same value."""
    order = np.argsort(-x, kind="stable")
    x, bound = x[order], bound[order]
    above = x[:-1] > 1.0 + bound[:-1]
    told = (x[:-1] - bound[:-1] > x[1:] + bound[1:]) | (x[:-1] == x[1:])
    return float(told[above].mean())


def reference(bench: Bench) -> Result:
    """Values to compare with: solved as far as rounding allows, and the residual looked at by SciPy."""
    from scipy import sparse

    from swaygauge.graph import Graph
    from swaygauge.scores.fairshare import fairshare
    from swaygauge.scores.katz import katz
    from swaygauge.scores.spectrum import bound_lambda

    graph = Graph(bench.n, bench.source, bench.target)
    bounds = bound_lambda(graph)
    pull = sparse.csr_matrix((np.ones(len(bench.source)), (bench.target, bench.source)), shape=(bench.n, bench.n))
    keep: dict[str, Any] = {"lambda_upper": bounds.upper}
    worst = 0.0
    for share in ("0.5", "0.85", "0.99"):
        alpha = float(share) / bounds.upper
        solution = katz(graph, alpha=alpha, tolerance=1e-13)
        residual = 1 + alpha * (pull @ solution.value) - solution.value
        worst = max(worst, float(np.abs(residual / solution.value).max()))
        keep[f"katz {share}"] = solution.value
    keep["fairshare"] = fairshare(graph, alpha=DAMPING, tolerance=1e-13).value
    np.savez(bench.folder / "reference.npz", **keep)
    return {"residual": worst, "links": graph.m, "largest": int(graph.component_sizes().max())}


def igraph(bench: Bench) -> Result:
    """PageRank by PRPACK; its tolerance is fixed, one thread."""
    import igraph

    links = np.column_stack((bench.source, bench.target))
    graph, build = bench.timed(lambda: igraph.Graph(n=bench.n, edges=links, directed=True), 1)
    value, solve = bench.timed(lambda: graph.personalized_pagerank(damping=DAMPING, implementation="prpack"))
    return {"build": build, "fairshare": {"solve": solve, "error": bench.pagerank_error(value)}}


def networkit(bench: Bench) -> Result:
    """Katz (returns 2 x - 1, scaled) and PageRank, two threads, tolerances that meet the accuracy."""
    import networkit

    networkit.setNumberOfThreads(2)
    pair = (bench.source.astype(np.uint64), bench.target.astype(np.uint64))
    graph, build = bench.timed(lambda: networkit.GraphFromCoo(pair, n=bench.n, directed=True, weighted=False), 1)

    def katz() -> Any:
        run = networkit.centrality.KatzCentrality(graph, bench.alpha("0.85"), 1.0, 1e-6)
        return np.array(run.run().scores())

    def pagerank() -> Any:
        sinks = networkit.centrality.SinkHandling.DistributeSinks
        run = networkit.centrality.PageRank(graph, damp=DAMPING, tol=1e-12, distributeSinks=sinks)
        run.maxIterations = 2000
        return np.array(run.run().scores())

    value, solve = bench.timed(katz)
    told = {"build": build, "katz 0.85": {"solve": solve, "error": bench.katz_error("0.85", value, twice=True)}}
    value, solve = bench.timed(pagerank)
    told["fairshare"] = {"solve": solve, "error": bench.pagerank_error(value)}
    return told


def scipy_bicgstab(bench: Bench) -> Result:
    """Katz by BiCGSTAB on a CSR matrix, one thread."""
    from scipy import sparse
    from scipy.sparse import linalg

    shape = (bench.n, bench.n)
    ones = np.ones(len(bench.source))
    pull, build = bench.timed(lambda: sparse.csr_matrix((ones, (bench.target, bench.source)), shape=shape), 1)
    alpha = bench.alpha("0.85")
    operator = linalg.LinearOperator(shape, lambda x: x - alpha * (pull @ x), dtype=np.float64)
    (value, _), solve = bench.timed(lambda: linalg.bicgstab(operator, np.ones(bench.n), rtol=1e-10, maxiter=2000))
    return {"build": build, "katz 0.85": {"solve": solve, "error": bench.katz_error("0.85", value)}}


def scipy_power(bench: Bench) -> Result:
    """Katz by the plain fixed-point iteration on a CSR matrix, one thread."""
    from scipy import sparse

    shape = (bench.n, bench.n)
    ones = np.ones(len(bench.source))
    pull, build = bench.timed(lambda: sparse.csr_matrix((ones, (bench.target, bench.source)), shape=shape), 1)
    alpha = bench.alpha("0.85")

    def iterate() -> Any:
        x = np.ones(bench.n)
        while True:
            y = 1 + alpha * (pull @ x)
            if np.abs(y / x - 1).max() <= 1e-8 * 0.15:
                return y
            x = y

    value, solve = bench.timed(iterate, 1)
    return {"build": build, "katz 0.85": {"solve": solve, "error": bench.katz_error("0.85", value)}}


def scikit_network(bench: Bench) -> Result:
    """Katz as a sum over walks of a fixed length, which is chosen here to meet the accuracy."""
    from scipy import sparse
    from sknetwork.ranking import Katz

    shape = (bench.n, bench.n)
    flags = np.ones(len(bench.source), bool)
    graph, build = bench.timed(lambda: sparse.csr_matrix((flags, (bench.source, bench.target)), shape=shape), 1)
    method = Katz(damping_factor=bench.alpha("0.85"), path_length=120)
    value, solve = bench.timed(lambda: method.fit_predict(graph), 1)
    return {"build": build, "katz 0.85": {"solve": solve, "error": bench.katz_error("0.85", value + 1)}}


def networkx(bench: Bench) -> Result:
    """PageRank in pure Python and SciPy; small networks only."""
    import networkx

    def make() -> Any:
        graph = networkx.DiGraph()
        graph.add_nodes_from(range(bench.n))
        graph.add_edges_from(zip(bench.source.tolist(), bench.target.tolist(), strict=True))
        return graph

    graph, build = bench.timed(make, 1)
    tolerance = 1e-10 / bench.n
    value, solve = bench.timed(lambda: networkx.pagerank(graph, alpha=DAMPING, tol=tolerance, max_iter=1000), 1)
    error = bench.pagerank_error(np.fromiter(value.values(), float, bench.n))
    return {"build": build, "fairshare": {"solve": solve, "error": error}}


TASKS: dict[str, Callable[[Bench], Result]] = {
    "reference": reference,
    "ours": ours,
    "igraph": igraph,
    "networkit": networkit,
    "scipy_bicgstab": scipy_bicgstab,
    "scipy_power": scipy_power,
    "scikit_network": scikit_network,
    "networkx": networkx,
}


def peak() -> int:
    """Largest memory of this process so far, in bytes."""
    status = Path("/proc/self/status")
    if status.exists():  # getrusage would count what the parent held when it started this process
        line = next(line for line in status.read_text().splitlines() if line.startswith("VmHWM"))
        return int(line.split()[1]) * 1024
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024


def main() -> None:
    task, folder, repeats = sys.argv[1], Path(sys.argv[2]), int(sys.argv[3])
    bench = Bench(folder, repeats)
    if task == "ours":
        warm_up()
    before = peak()
    try:
        told = TASKS[task](bench)
    except ImportError as error:
        told = {"missing": str(error)}
    told["bytes per link"] = (peak() - before) / len(bench.source)
    print(json.dumps(told))


def warm_up() -> None:
    """Load or compile every kernel, so that no measurement contains it."""
    from swaygauge.graph import Graph
    from swaygauge.scores.fairshare import fairshare
    from swaygauge.scores.katz import katz
    from swaygauge.scores.leaks import leak_report

    rng = np.random.default_rng(0)
    graph = Graph(3000, rng.integers(0, 3000, 30_000), rng.integers(0, 3000, 30_000))
    leak_report(graph)
    katz(graph, alpha=0.01)
    fairshare(graph)


if __name__ == "__main__":
    main()
