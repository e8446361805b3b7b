"""A good guess at the leading eigenvector of one strong component: Arnoldi 1951, Quart. Appl. Math. 9.

Our own few lines rather than ARPACK, because the start is fixed and every product is added up in a fixed order: same
bytes for any number of threads. Nothing here is trusted; :mod:`spectrum` proves what comes of it.
"""

from __future__ import annotations

import numpy as np

from swaygauge.graph import Block, Rows
from swaygauge.kernels import sweeping
from swaygauge.kernels.threads import in_parts
from swaygauge.records import Floats

DENSE = 400  # components up to this size go to LAPACK


def improved(rows: Rows, block: Block, v: Floats, *, steps: int) -> Floats:
    """The leading Ritz vector of the Krylov space of v, made positive."""
    if len(v) <= DENSE:
        return _positive(_dense_vector(rows, block), v)
    basis = np.empty((steps + 1, len(v)))
    hessenberg = np.zeros((steps + 1, steps))
    totals = np.zeros((len(block.cuts) - 1, steps + 2))
    spare = np.zeros((len(block.cuts) - 1, 4))
    _add(block, basis[:1], v, _norm(block, v, totals))
    used = 0
    for j in range(steps):
        image = basis[j + 1]
        in_parts(
            sweeping.power,
            block.cuts,
            rows.start,
            block.inner,
            rows.source,
            rows.weight,
            basis[j],
            block.low,
            0.0,
            image,
            spare,
        )
        in_parts(sweeping.project, block.cuts, basis, j + 1, image, totals)
        products = totals.sum(axis=0)
        hessenberg[: j + 1, j] = products[: j + 1]
        in_parts(sweeping.add_up, block.cuts, basis, -products[: j + 1], image)
        left = _norm(block, image, totals)
        hessenberg[j + 1, j] = left
        used = j + 1
        if left <= 1e-12 * np.sqrt(products[j + 1]):
            break
        image *= 1.0 / left
    values, vectors = np.linalg.eig(hessenberg[:used, :used])
    leading = vectors[:, np.argmax(values.real)].real.copy()
    ritz = np.zeros(len(v))
    in_parts(sweeping.add_up, block.cuts, basis, leading, ritz)
    return _positive(ritz, v)


def _norm(block: Block, vector: Floats, totals: Floats) -> float:
    in_parts(sweeping.project, block.cuts, vector[None, :], 0, vector, totals)
    return float(np.sqrt(totals[:, 0].sum()))


def _add(block: Block, row: Floats, v: Floats, norm: float) -> None:
    np.multiply(v, 1.0 / norm, out=row[0])


def _dense_vector(rows: Rows, block: Block) -> Floats:
    size = block.high - block.low
    matrix = np.zeros((size, size))
    for i in range(size):
        links = slice(int(block.inner[i]), int(rows.start[block.low + i + 1]))
        matrix[i, rows.source[links] - block.low] = rows.weight[links] if len(rows.weight) else 1.0
    values, vectors = np.linalg.eig(matrix)
    vector: Floats = vectors[:, np.argmax(values.real)].real.copy()
    return vector


def _positive(vector: Floats, before: Floats) -> Floats:
    """|vector|, and where it is nothing but rounding, the vector before on the same scale."""
    size = np.abs(vector)
    top = float(size.max())
    if not (np.isfinite(top) and top > 0.0):
        return before
    positive: Floats = np.maximum(size / top, 1e-18 * before / before.max())
    return np.maximum(positive, 1e-280)
