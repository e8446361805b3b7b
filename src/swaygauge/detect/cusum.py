"""One step of Page's cumulative sum, for any number of series at once."""

from __future__ import annotations

import numpy as np

from swaygauge.records import Floats


def step_up(total: Floats, z: Floats, *, allowance: float) -> Floats:
    """The upper sum after one more value: max(0, total + z - allowance). Page 1954; NIST e-Handbook 6.3.2.3."""
    stepped: Floats = np.maximum(0.0, total + z - allowance)
    return stepped


def step_down(total: Floats, z: Floats, *, allowance: float) -> Floats:
    """The lower sum after one more value: max(0, total - z - allowance)."""
    return step_up(total, -z, allowance=allowance)
