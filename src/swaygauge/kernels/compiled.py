"""The decorator that compiles a kernel and keeps the machine code for the next process."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar, cast

from numba import njit

Kernel = TypeVar("Kernel", bound=Callable[..., Any])


def compiled(function: Kernel) -> Kernel:
    """Compile on first call, without the interpreter lock and without reordering sums; cached where possible.

    Where no cache folder can be written (a read-only installation without a home directory) every process compiles
    for itself. numba writes cache files beside and renames them in, so processes may start at once.
    """
    try:
        kernel = njit(cache=True, nogil=True, error_model="numpy")(function)
    except RuntimeError:
        kernel = njit(nogil=True, error_model="numpy")(function)
    _KERNELS.append(kernel)
    return cast(Kernel, kernel)  # the dispatcher stands in for the function


def first_use() -> bool:
    """Whether no kernel imported so far has machine code stored, so that the next calls compile (seconds, once)."""
    return not any(_stored(kernel) for kernel in _KERNELS)


def _stored(kernel: Any) -> bool:
    if not hasattr(kernel, "signatures"):
        return True  # the compiler is switched off
    if kernel.signatures:
        return True
    index = getattr(getattr(kernel, "_cache", None), "_cache_file", None)
    load = getattr(index, "_load_index", None)  # numba tells nobody; without an answer, assume it is there
    return load is None or bool(load())


_KERNELS: list[Any] = []
