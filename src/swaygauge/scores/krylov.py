"""A good guess at the leading eigenvector of one strong component: Arnoldi 1951, Quart. Appl. Math. 9.

Our own few lines rather than ARPACK, because the start is fixed and every product is added up in a fixed order: same
bytes for any number of threads. Nothing here is trusted; :mod:`spectrum` proves what comes of it.
"""

from __future__ import annotations

import numpy as np
from scipy import linalg

from swaygauge.graph import Block, Rows
from swaygauge.kernels import sweeping
from swaygauge.kernels.threads import in_parts
from swaygauge.records import Floats

STEPS = 22  # dimension of the Krylov space, all the memory that is spent on it
KEPT = 11  # of these are kept when the space is full
RESTARTS = 12
SETTLED = 1e-9  # a Ritz pair this close to an eigenpair needs no more steps
DENSE = 400  # components up to this size go to LAPACK


def improved(rows: Rows, block: Block, v: Floats) -> Floats:
    """The leading Ritz vector of Krylov spaces that start with v, made positive."""
    if len(v) <= DENSE:
        return _positive(_dense_vector(rows, block), v)
    basis = np.empty((STEPS + 1, len(v)))
    projected = np.zeros((STEPS + 1, STEPS))
    totals = np.zeros((len(block.cuts) - 1, STEPS + 2))
    np.multiply(v, 1.0 / _norm(block, v, totals), out=basis[0])
    kept = used = 0
    for _ in range(RESTARTS):
        used, settled = _extend(rows, block, basis, projected, kept, totals)
        if settled:
            break
        kept = _restart(block, basis, projected)
    if not settled:
        used = max(kept, 1)
    _, leading = _leading(projected[:used, :used])
    ritz = np.zeros(len(v))
    in_parts(sweeping.add_up, block.cuts, basis, leading, ritz)
    return _positive(ritz, v)


def _extend(rows: Rows, block: Block, basis: Floats, projected: Floats, first: int, totals: Floats) -> tuple[int, bool]:
    """Arnoldi steps from a basis of first + 1 vectors on: how many there are then, and whether a Ritz pair settled."""
    spare = np.zeros((len(block.cuts) - 1, 4))
    for j in range(first, STEPS):
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
        projected[: j + 1, j] = products[: j + 1]
        in_parts(sweeping.add_up, block.cuts, basis, -products[: j + 1], image)
        left = _norm(block, image, totals)
        projected[j + 1, j] = left
        if left <= 1e-12 * np.sqrt(products[j + 1]):
            return j + 1, True
        if j >= 5 and j % 3 == 2:
            radius, leading = _leading(projected[: j + 1, : j + 1])
            if left * abs(leading[-1]) <= SETTLED * radius:  # the residual of the Ritz pair, relative
                return j + 1, True
        image *= 1.0 / left
    return STEPS, False


def _restart(block: Block, basis: Floats, projected: Floats) -> int:
    """Keep the rightmost part of the space and the vector that leads on (Krylov-Schur: Stewart 2002, SIAM J. Matrix
    Anal. Appl. 23(3)); returns the dimension kept."""
    square = projected[:STEPS, :STEPS].copy()
    reals = np.sort(np.linalg.eigvals(square).real)[::-1]
    cut = KEPT - 3 + int(np.argmax(-np.diff(reals[KEPT - 3 : KEPT + 4])))  # where the gap is widest
    bound = 0.5 * (reals[cut] + reals[cut + 1])
    try:
        schur, rotation, kept = linalg.schur(square, output="real", sort=lambda real, imag: real > bound)
    except linalg.LinAlgError:  # rounding moved an eigenvalue across the bound
        in_parts(sweeping.rotate, block.cuts, basis, _leading(square)[1][:, None].copy())
        projected[:] = 0.0
        return 0
    kept = max(1, min(int(kept), STEPS - 2))
    in_parts(sweeping.rotate, block.cuts, basis, np.ascontiguousarray(rotation[:, :kept]))
    basis[kept] = basis[STEPS]
    tail = projected[STEPS, STEPS - 1] * rotation[STEPS - 1, :kept]
    projected[:] = 0.0
    projected[:kept, :kept] = schur[:kept, :kept]
    projected[kept, :kept] = tail
    return kept


def _leading(matrix: Floats) -> tuple[float, Floats]:
    """The rightmost eigenvalue and its eigenvector, of length 1, real parts."""
    values, vectors = np.linalg.eig(matrix)
    at = int(np.argmax(values.real))
    return float(values[at].real), vectors[:, at].real.copy()


def _norm(block: Block, vector: Floats, totals: Floats) -> float:
    in_parts(sweeping.project, block.cuts, vector[None, :], 0, vector, totals)
    return float(np.sqrt(totals[:, 0].sum()))


def _dense_vector(rows: Rows, block: Block) -> Floats:
    size = block.high - block.low
    matrix = np.zeros((size, size))
    for i in range(size):
        links = slice(int(block.inner[i]), int(rows.start[block.low + i + 1]))
        matrix[i, rows.source[links] - block.low] = rows.weight[links] if len(rows.weight) else 1.0
    return _leading(matrix)[1]


def _positive(vector: Floats, before: Floats) -> Floats:
    """|vector|, and where it is nothing but rounding, the vector before on the same scale."""
    size = np.abs(vector)
    top = float(size.max())
    if not (np.isfinite(top) and top > 0.0):
        return before
    positive: Floats = np.maximum(size / top, 1e-18 * before / before.max())
    return np.maximum(positive, 1e-280)
