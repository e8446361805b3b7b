"""Every number a reviewer might argue about, with what it means."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Annotated, Final, Literal, get_args

from annotated_types import Ge, Gt, Le, Lt

KindName = Literal[
    "held",
    "degraded",
    "overdue",
    "coverage_step",
    "lambda_jump",
    "displacement",
    "surge",
    "rename",
    "arrival",
    "departure",
    "swing",
    "drift",
]
Share = Annotated[float, Gt(0), Lt(1)]
Ratio = Annotated[float, Gt(1)]
Place = Annotated[int, Ge(1)]
Nights = Annotated[int, Ge(1)]

ALL_KINDS: Final[tuple[KindName, ...]] = get_args(KindName)


@dataclass(frozen=True)
class Surge:
    """More new, or more lost, endorsements than the node's own history and its standing explain."""

    q: Share = 0.10  # false discovery rate over all present nodes (Benjamini and Hochberg 1995)
    ratio: Ratio = 1.25  # least ratio of the two ranks, under any score
    tail: Annotated[float, Gt(2)] = 7.0  # P(count > k) falls like k^-tail; smaller = more bursts expected by nature
    memory: Share = 0.85  # weight of a node's own history after one night
    dispersion_memory: Share = 0.90  # the same for how much nodes differ from their standing


@dataclass(frozen=True)
class TailGuard:
    """Lowers ``surge.tail`` on a network whose quiet nights show more bursts than that tail allows."""

    nights: Nights = 28  # looks back over so many nights
    needed: Nights = 8  # and does nothing with fewer
    level: Share = 1e-4  # counts nodes at least this surprising that were not reported
    excess: Annotated[float, Gt(1)] = (
        4.0  # and acts when there are more than this many times as many as there should be
    )
    tails: tuple[Annotated[float, Gt(2)], ...] = (5.0, 4.0)  # heavier tails to try, in order


@dataclass(frozen=True)
class Swing:
    """A large move by whatever cause: one powerful endorser, an indirect rise, a lost hub link."""

    ratio: Ratio = 1.5  # least ratio of the two ranks
    min_value_change: Annotated[float, Ge(0)] = (
        0.05  # least change of the log value against the depth band, same direction
    )
    early_ratio: Ratio = 2.0  # least ratio while there are fewer than ``quiet_history`` nights
    raised: tuple[Ratio, ...] = (2.0, 3.0, 4.0, 6.0, 8.0, 12.0, 16.0)  # taken instead where ``ratio`` fires too often
    budget: Annotated[float, Gt(0)] = 4.0  # the smallest ratio with at most so many swings a night is used
    budget_nights: Nights = 28  # over so many nights


@dataclass(frozen=True)
class Drift:
    """A small change night after night: CUSUM of the standardised change of the log value."""

    ratio: Ratio = 1.5  # least cumulative ratio of ranks since the sum was last zero
    allowance: Annotated[float, Gt(0)] = 0.5  # k, in standard deviations; half the shift to be found
    limits: tuple[Annotated[float, Gt(0)], ...] = (10.0, 12.0, 14.0, 16.0, 20.0, 24.0)  # h, run side by side
    first_limit: Annotated[float, Gt(0)] = 12.0  # the h used until there is enough history; one of ``limits``
    budget: Annotated[float, Gt(0)] = 0.5  # the smallest h with at most so many first alerts a night is used
    budget_nights: Nights = 28  # over so many nights
    cooldown: Nights = 14  # nights in which the same node and direction is not reported again
    clip: Annotated[float, Gt(0)] = 4.0  # a single night counts for at most so many standard deviations
    window: Nights = 14  # nights behind the band spread, the roughness and the counts shown
    winsor: Share = 0.99  # changes beyond this quantile count as this quantile in the band spread
    reach: Annotated[float, Ge(1)] = 16.0  # nodes are followed down to this many times ``watch_rank``


@dataclass(frozen=True)
class Presence:
    """Nodes that come, leave, or change their name."""

    arrival_rank: Place = 300  # first seen tonight at this place or better
    departure_rank: Place = 300  # gone from this place or better
    rename_overlap: Annotated[float, Gt(0), Le(1)] = 0.6  # Jaccard overlap of the endorsers of the old and the new node
    rename_shared: Annotated[int, Ge(1)] = 3  # and at least so many endorsers in common


@dataclass(frozen=True)
class Network:
    """Things that concern the network as a whole."""

    lambda_jump: Annotated[float, Gt(0)] = 0.03  # proven relative rise of the spectral radius in one night
    lambda_back_to: Annotated[float, Ge(1)] = 1.01  # the named nodes bring it back to this many times the night before
    ring_mass: Share = 0.25  # and include nodes with at least this share of the last needed node's gain
    displaced_nodes: Annotated[int, Ge(1)] = 5  # watched nodes whose rank, but not whose own score, moved


@dataclass(frozen=True)
class Thresholds:
    """When the detector speaks. Ranks are places: 1 is the best."""

    kinds: tuple[KindName, ...] = ALL_KINDS  # kinds that raise alerts
    watch_rank: Place = 1000  # a node is watched when its better rank of the two nights is this place or better
    watch_names: tuple[str, ...] = ()  # nodes watched at any place, by name
    quiet_history: Annotated[int, Ge(0)] = 8  # accepted nights before surge and drift speak at all
    provisional_until: Annotated[int, Ge(0)] = 14  # accepted nights before alerts are no longer marked provisional
    surge: Surge = field(default_factory=Surge)
    tail_guard: TailGuard = field(default_factory=TailGuard)
    swing: Swing = field(default_factory=Swing)
    drift: Drift = field(default_factory=Drift)
    presence: Presence = field(default_factory=Presence)
    network: Network = field(default_factory=Network)

    def __post_init__(self) -> None:
        if self.drift.first_limit not in self.drift.limits:
            raise ValueError(f"drift.first_limit = {self.drift.first_limit} must be one of drift.limits.")
        if list(self.drift.limits) != sorted(set(self.drift.limits)):
            raise ValueError(f"drift.limits = {self.drift.limits} must rise and hold no value twice.")
        ratios = (self.swing.ratio, *self.swing.raised)
        if list(ratios) != sorted(set(ratios)):
            raise ValueError(f"swing.ratio and swing.raised = {ratios} must rise and hold no value twice.")
