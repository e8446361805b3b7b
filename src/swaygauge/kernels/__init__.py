"""Loops over index arrays, compiled by numba (``compiled.py`` is the only importer), and the threads that share them.

A kernel is plain Python that also runs with the compiler switched off (NUMBA_DISABLE_JIT=1). It gets its own writable,
contiguous arrays of one fixed type each, so every kernel is compiled once: a read-only array would be another type. A
missing array (weights of unweighted links) is an array of length 0. Helpers live in the file that uses them, because
numba's cache looks for changes in a function's own file only.

Kernels that work in parallel take ``cuts`` (bounds of row chunks, fixed by the graph alone), ``part`` and ``parts``:
part p handles chunks p, p + parts, ... Whatever the number of threads, each row is summed in the same order and chunk
totals are added in chunk order, so results are the same bytes.
"""
