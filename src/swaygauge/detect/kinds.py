"""The table of alert kinds, in the order in which they get a person's attention."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import Final, Literal

from swaygauge.detect import network
from swaygauge.detect.drift import find_drifts
from swaygauge.detect.inputs import NightInputs
from swaygauge.detect.picture import Picture
from swaygauge.detect.presence import find_arrivals, find_departures
from swaygauge.detect.rename import find_renames
from swaygauge.detect.surge import find_surges
from swaygauge.detect.swing import find_swings
from swaygauge.detect.thresholds import KindName, Thresholds
from swaygauge.records import Alert

OfSnapshot = Callable[[NightInputs, Thresholds], list[Alert]]
OfMoves = Callable[[Picture, Sequence[Alert]], list[Alert]]


@dataclass(frozen=True)
class Kind:
    """One kind of alert. Exactly one of the two functions finds it.

    Those of the snapshot run on every night, held ones too; those of moves on scored nights, in the order of the
    table, each with the alerts found before it.
    """

    name: KindName
    about: Literal["network", "node"]
    summary: str
    size: str  # what Alert.size measures; alerts of one kind are ordered by it, largest first
    of_snapshot: OfSnapshot | None = None
    of_moves: OfMoves | None = None


KINDS: Final[dict[str, Kind]] = {
    kind.name: kind
    for kind in (
        Kind("held", "network", "the snapshot was held and not scored", "1", of_snapshot=network.find_held),
        Kind(
            "lambda_jump",
            "network",
            "the spectral radius rose; names the nodes that carry it",
            "relative rise",
            of_snapshot=network.find_lambda_jump,
        ),
        Kind(
            "degraded",
            "network",
            "the snapshot was scored after carrying what was missing",
            "1",
            of_snapshot=network.find_degraded,
        ),
        Kind(
            "overdue",
            "network",
            "expected nights brought no snapshot",
            "nights missing",
            of_snapshot=network.find_overdue,
        ),
        Kind(
            "coverage_step", "network", "what the snapshots cover changed", "1", of_snapshot=network.find_coverage_step
        ),
        Kind(
            "displacement",
            "network",
            "many ranks moved though the nodes' own scores did not",
            "nodes displaced",
            of_moves=network.find_displacement,
        ),
        Kind(
            "surge",
            "node",
            "more new or lost endorsements than history and standing explain",
            "-log10 p",
            of_moves=find_surges,
        ),
        Kind(
            "rename",
            "node",
            "one came as another left, endorsed by mostly the same",
            "share of endorsers in common",
            of_moves=find_renames,
        ),
        Kind("arrival", "node", "came straight to a high place", "octaves above the line", of_moves=find_arrivals),
        Kind("departure", "node", "is gone from a high place", "octaves above the line", of_moves=find_departures),
        Kind("swing", "node", "moved far in one night, by whatever cause", "octaves", of_moves=find_swings),
        Kind(
            "drift",
            "node",
            "moved the same way night after night",
            "octaves since the move began",
            of_moves=find_drifts,
        ),
    )
}
_PLACE: Final = {name: place for place, name in enumerate(KINDS)}


def order_alerts(alerts: Iterable[Alert]) -> tuple[Alert, ...]:
    """By kind as in KINDS, then by size, largest first, then by node."""
    return tuple(sorted(alerts, key=lambda alert: (_PLACE[alert.kind], -alert.size, alert.node, alert.score)))
