"""Kernels: the same bytes for any number of threads, the same numbers without the compiler, a cache that may fail."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest

from swaygauge.graph import Graph
from swaygauge.kernels import compiled, threads
from swaygauge.scores.fairshare import fairshare
from swaygauge.scores.katz import katz
from swaygauge.scores.leaks import leak_report
from swaygauge.scores.spectrum import bound_lambda, leading_vectors


def clustered(n: int, m: int) -> tuple[np.ndarray, np.ndarray]:
    """A network with one large strong component, hubs and a tail of dangling nodes."""
    rng = np.random.default_rng(9)
    source = (n * rng.random(m) ** 2).astype(np.int32)
    target = (n * rng.random(m) ** 3).astype(np.int32)
    keys = np.unique(source.astype(np.int64) * n + target)
    return (keys // n).astype(np.int32), (keys % n).astype(np.int32)


def everything(n: int, source: np.ndarray, target: np.ndarray) -> bytes:
    graph = Graph(n, source, target)
    bounds = bound_lambda(graph)
    plain, shared = katz(graph, alpha=0.85 / bounds.upper), fairshare(graph)
    vectors = leading_vectors(graph)
    parts = (plain.value, plain.bound, shared.value, shared.bound, vectors.right, vectors.left)
    return repr(bounds).encode() + b"".join(part.tobytes() for part in parts)


def test_any_number_of_threads_and_any_order_give_the_same_bytes() -> None:
    n, (source, target) = 40_000, clustered(40_000, 400_000)
    assert len(Graph(n, source, target).rows.cuts) > 10, "large enough for several threads to be used"
    shuffle = np.random.default_rng(1).permutation(len(source))
    before = threads.use_threads(1)
    try:
        results = set()
        for count in (1, 2, 4):
            threads.use_threads(count)
            results.add(everything(n, source, target))
            results.add(everything(n, source[shuffle], target[shuffle]))
    finally:
        threads.use_threads(before)
    assert len(results) == 1


def test_threads_need_a_sensible_number() -> None:
    with pytest.raises(ValueError, match="at least 1 thread, got 0"):
        threads.use_threads(0)


def test_an_error_in_a_helper_thread_is_not_lost() -> None:
    def kernel(part: int, parts: int, cuts: np.ndarray) -> None:
        if part == 1:
            raise ArithmeticError("in part 1")

    before = threads.use_threads(2)
    try:
        with pytest.raises(ArithmeticError, match="in part 1"):
            threads.in_parts(kernel, np.arange(5))
    finally:
        threads.use_threads(before)


SCRIPT = """
import json, sys
import numpy as np
from swaygauge.graph import Graph
from swaygauge.scores.fairshare import fairshare
from swaygauge.scores.katz import katz
from swaygauge.scores.leaks import leak_report
from swaygauge.scores.spectrum import bound_lambda
n, source, target, weight = json.load(sys.stdin)
told = {}
for name, given in (("plain", None), ("weighted", weight)):
    graph = Graph(n, source, target, weight=given)
    bounds = bound_lambda(graph)
    one, two = katz(graph, alpha=0.8 / bounds.upper), fairshare(graph)
    told[name] = [bounds.lower, bounds.upper, *one.value, *one.bound, *two.value, leak_report(graph).zeroed_count]
print(json.dumps(told))
"""


def test_without_the_compiler_the_numbers_are_the_same() -> None:
    rng = np.random.default_rng(2)
    n = 120
    links = [n, rng.integers(0, n, 700).tolist(), rng.integers(0, n, 700).tolist(), rng.uniform(0.1, 9, 700).tolist()]
    told = []
    for off in ("0", "1"):
        done = subprocess.run(
            [sys.executable, "-c", SCRIPT],
            input=json.dumps(links),
            env=os.environ | {"NUMBA_DISABLE_JIT": off},
            check=True,
            capture_output=True,
            text=True,
        )
        told.append(json.loads(done.stdout))
    for name in ("plain", "weighted"):
        np.testing.assert_allclose(told[0][name], told[1][name], rtol=1e-9)


def test_no_folder_for_the_cache_means_compiling_in_every_process(monkeypatch: pytest.MonkeyPatch) -> None:
    real = compiled.njit

    def without_cache(**options: object) -> object:
        if options.get("cache"):
            raise RuntimeError("cannot cache function: no locator available")
        return real(**options)

    monkeypatch.setattr(compiled, "njit", without_cache)
    monkeypatch.setattr(compiled, "_KERNELS", [])

    @compiled.compiled
    def double(x: int) -> int:
        return 2 * x

    assert double(4) == 8
    assert not compiled.first_use(), "it is compiled by now"


def test_a_cache_folder_that_cannot_be_written(tmp_path: Path) -> None:
    code = (
        "from swaygauge.kernels import building; import numpy as np;"
        "a = np.zeros(3, np.int32); print(building.is_tidy(a, a))"
    )
    file = tmp_path / "file"
    file.write_text("not a folder")
    done = subprocess.run(
        [sys.executable, "-c", code],
        env=os.environ | {"NUMBA_CACHE_DIR": str(file / "below")},
        check=True,
        capture_output=True,
        text=True,
    )
    assert done.stdout.strip() == "False"


def test_two_processes_that_start_at_once_with_an_empty_cache(tmp_path: Path) -> None:
    code = (
        "from swaygauge.kernels import components, compiled; import numpy as np; first = compiled.first_use();"
        "start, column = np.array([0, 1, 2]), np.array([1, 0], np.int32);"
        "spare = [np.empty(2, np.int32) for _ in range(3)];"
        "print(first, components.strong_components(start, column, column, *spare, np.empty(2, np.int64)))"
    )
    running = [
        subprocess.Popen(
            [sys.executable, "-c", code],
            env=os.environ | {"NUMBA_CACHE_DIR": str(tmp_path)},
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
        )
        for _ in range(2)
    ]
    for process in running:
        out, problems = process.communicate(timeout=120)
        assert (process.returncode, out.strip()) == (0, "True 1"), problems


def test_first_use_is_over_once_kernels_have_run() -> None:
    leak_report(Graph(3, [0, 1, 2], [1, 0, 1]))
    ran = SimpleNamespace(signatures=["any"])
    assert compiled._stored(ran)
    assert compiled._stored(lambda: None), "without the compiler there is nothing to wait for"
