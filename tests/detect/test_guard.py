import numpy as np
import pytest

from swaygauge.detect.guard import GuardHistory, choose_tail
from swaygauge.detect.thresholds import TailGuard

GUARD = TailGuard()


def history(*nightly: int, nodes: int = 10_000) -> GuardHistory:
    """The same numbers under the first tail, half of them under the second, none under the third."""
    first = np.array(nightly, np.int64)
    return GuardHistory(np.full(len(first), nodes), np.stack((first, first // 2, 0 * first), axis=1))


@pytest.mark.parametrize(
    ("seen", "tail"),
    [
        (history(), 0),
        (history(*[50] * 7), 0),  # too few nights to tell
        (history(*[4] * 10), 0),  # exactly four times as many as 1e-4 of 10,000
        (history(*[5] * 10), 1),
        (history(*[10] * 10), 2),
        (history(*[2] * 27, 900), 0),  # one eventful night does not decide
    ],
)
def test_which_tail(seen: GuardHistory, tail: int) -> None:
    assert choose_tail(seen, GUARD) == tail


def test_old_nights_are_forgotten() -> None:
    seen = GuardHistory.empty(3)
    for number in range(40):
        seen = seen.after(100 + number, np.array([number, 0, 0]), nights=28)
    assert seen.present.tolist() == list(range(112, 140))
    assert seen.surprising[:, 0].tolist() == list(range(12, 40))
