"""Anderson acceleration: mix the last images of a map so that their errors cancel best.

Anderson 1965, "Iterative procedures for nonlinear integral equations", J. ACM 12(4). For a linear map it is close to
GMRES (Walker, Ni 2011, SIAM J. Numer. Anal. 49(4)), so the number of sweeps hardly depends on how close alpha is to
its limit. Depth 2 is enough where one slow direction stands out; where sweeps gain little, as with strong communities,
the depth grows.
"""

from __future__ import annotations

import numpy as np

from swaygauge.records import Floats

SHALLOW = 2  # earlier images mixed at first
DEEP = 12  # at most
ASTRAY = 1e3  # growth of the error after which earlier images are forgotten
SLOW = 0.3  # a sweep that leaves more than this share of the error asks for more depth


class Mixer:
    """The last images of a map with their errors, over k rows whose products come in chunks."""

    def __init__(self, k: int, chunks: int) -> None:
        self.mapped = np.empty((DEEP + 1, k))  # pages are only touched when a slot is used
        self.error = np.empty((DEEP + 1, k))
        self.totals = np.zeros((chunks, DEEP + 2))
        self.used = 0
        self._gram = np.zeros((DEEP + 1, DEEP + 1))
        self._recent: list[int] = []  # slots, oldest first
        self._depth = SHALLOW
        self._norms: list[float] = []

    def next_slot(self) -> int:
        """Where the next image goes: a new slot, or the oldest once the depth is reached."""
        if self.used <= self._depth:
            slot = self.used
            self.used += 1
        else:
            slot = self._recent.pop(0)
        self._recent.append(slot)
        return slot

    def take_in(self, slot: int) -> float:
        """Add the chunk totals of a new image; returns its largest error."""
        products = self.totals[:, : self.used].sum(axis=0)
        self._gram[slot, : self.used] = products
        self._gram[: self.used, slot] = products
        norm = float(np.sqrt(products[slot]))
        if self._norms and not norm <= ASTRAY * min(self._norms):
            self._recent, self._norms = [slot], []  # start again from here
        self._norms.append(norm)
        if len(self._norms) > 4 and self._depth < DEEP and self._norms[-1] > SLOW**2 * self._norms[-3]:
            self._depth += 1
        return float(self.totals[:, -1].max())

    def weights(self, slot: int) -> Floats:
        """theta (used,) with sum 1 that makes |sum theta * error| smallest."""
        theta = np.zeros(self.used)
        theta[slot] = 1.0
        gram, others = self._gram, np.array([j for j in self._recent if j != slot], np.intp)
        # |difference of two errors|^2; of no use where cancellation left nothing of it
        size = gram[slot, slot] - 2.0 * gram[slot, others] + gram[others, others]
        told = size > 1e-10 * (gram[slot, slot] + gram[others, others])
        others, size = others[told], np.sqrt(size[told])
        if len(others):
            right = gram[slot, slot] - gram[slot, others]
            left = right[:, None] - gram[others, slot][None, :] + gram[np.ix_(others, others)]
            left = left / size[:, None] / size[None, :]
            left[np.diag_indices(len(others))] += 1e-13
            share = np.linalg.solve(left, right / size) / size
            if np.all(np.isfinite(share)):
                theta[others] = share
                theta[slot] = 1.0 - share.sum()
        return theta
