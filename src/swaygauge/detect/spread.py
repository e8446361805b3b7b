"""The usual size of a night's change at each depth: a winsorised standard deviation over trailing nights.

The median absolute deviation is the wrong unit here (most nodes do not move at all). The values of a night are kept as
a histogram of their size, eight bins to the octave with the exact sum of squares in each, so memory does not grow with
the network.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from swaygauge.records import Floats, Ids, Ints

BINS_PER_OCTAVE: Final = 8
LOWEST_OCTAVE: Final = -34  # 6e-11, below what scores are proven to
BINS: Final = BINS_PER_OCTAVE * 42
LEAST_VALUES: Final = 20  # a band with fewer values has no spread yet


@dataclass(frozen=True)
class SpreadHistory:
    """Non-empty cells of the trailing nights' histograms, sorted by night, band, bin; all (k,)."""

    night: Ints  # the night's number
    band: Ints
    bin: Ints
    count: Ints
    squares: Floats  # sum of squares of the values in the cell

    @staticmethod
    def empty() -> SpreadHistory:
        """No night yet."""
        none = np.zeros(0, np.int64)
        return SpreadHistory(none, none, none, none, np.zeros(0))

    def after(self, number: int, band: Ids, deviation: Floats, *, window: int) -> SpreadHistory:
        """With one more night: finite deviations and their depth bands (n,); nights older than ``window`` go."""
        size = np.abs(deviation)
        octave = np.log2(np.maximum(size, 2.0**LOWEST_OCTAVE)) - LOWEST_OCTAVE
        cell = band.astype(np.int64) * BINS + np.minimum(octave * BINS_PER_OCTAVE, BINS - 1).astype(np.int64)
        count = np.bincount(cell)
        used = np.flatnonzero(count)
        squares = np.bincount(cell, weights=size**2)[used]
        kept = self.night > number - window
        return SpreadHistory(
            np.concatenate((self.night[kept], np.full(len(used), number, np.int64))),
            np.concatenate((self.band[kept], used // BINS)),
            np.concatenate((self.bin[kept], used % BINS)),
            np.concatenate((self.count[kept], count[used])),
            np.concatenate((self.squares[kept], squares)),
        )


def band_spread(history: SpreadHistory, *, bands: int, winsor: float) -> Floats:
    """(bands,) the winsorised standard deviation of each depth band; 0 where there is none or too little to say."""
    cell = history.band * BINS + history.bin
    shape = (bands, BINS)
    inside = history.band < bands
    count = np.bincount(cell[inside], weights=history.count[inside], minlength=bands * BINS).reshape(shape)
    squares = np.bincount(cell[inside], weights=history.squares[inside], minlength=bands * BINS).reshape(shape)
    spread = np.zeros(bands)
    for band in np.flatnonzero(count.sum(axis=1) > LEAST_VALUES):
        values = float(count[band].sum())
        last = int(np.searchsorted(np.cumsum(count[band]), winsor * values))  # the bin that holds the quantile
        cut = squares[band, last] / count[band, last]
        beyond = float(count[band, last + 1 :].sum())
        spread[band] = np.sqrt((float(squares[band, : last + 1].sum()) + beyond * cut) / values)
    return spread
