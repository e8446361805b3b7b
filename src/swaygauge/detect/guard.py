"""Whether the tail of the count model is heavy enough for this network: quiet nights are the witness."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from swaygauge.detect.thresholds import TailGuard
from swaygauge.records import Ints


@dataclass(frozen=True)
class GuardHistory:
    """Trailing nights, oldest first: nodes present (t,), and per tail tried (t, k) the surprising ones not reported."""

    present: Ints
    surprising: Ints

    @staticmethod
    def empty(tails: int) -> GuardHistory:
        """No night yet."""
        return GuardHistory(np.zeros(0, np.int64), np.zeros((0, tails), np.int64))

    def after(self, present: int, surprising: Ints, *, nights: int) -> GuardHistory:
        """With one more night, the oldest beyond ``nights`` forgotten."""
        return GuardHistory(
            np.append(self.present, present)[-nights:].astype(np.int64),
            np.vstack((self.surprising, surprising))[-nights:].astype(np.int64),
        )


def choose_tail(history: GuardHistory, guard: TailGuard) -> int:
    """Which tail to use: the first whose surprising nodes are not too many for ``guard.level``, else the heaviest.

    Nightly numbers are cut at their own 90 % quantile, so that one eventful night does not decide.
    """
    tails = int(history.surprising.shape[1])
    if len(history.present) < guard.needed:
        return 0
    allowed = guard.excess * guard.level * float(history.present.sum())
    for tail in range(tails):
        nightly = history.surprising[:, tail].astype(np.float64)
        if float(np.minimum(nightly, np.quantile(nightly, 0.9)).sum()) <= allowed:
            return tail
    return tails - 1
