"""What the store knows of the nights before one night."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from functools import cached_property

from swaygauge.night.steps import LOOK_BACK, trailing_profiles
from swaygauge.night.work import Work
from swaygauge.records import Ids, LinkBook, Profile, Snapshot, Verdict
from swaygauge.store.rows import NightRow

HELD_IN_A_ROW = 2  # held nights before this one that a new baseline is judged on


@dataclass(frozen=True)
class History:
    """The accepted nights before a night, and the held ones directly before it."""

    work: Work
    night: date

    @cached_property
    def accepted(self) -> tuple[NightRow, ...]:
        """Every accepted night before this one, in date order."""
        return self.work.store.accepted_nights(self.work.network, before=self.night)

    @property
    def previous(self) -> NightRow | None:
        """The accepted night that this one is compared with."""
        return self.accepted[-1] if self.accepted else None

    @property
    def gap_nights(self) -> int:
        """Expected nights between the previous accepted night and this one."""
        if self.previous is None:
            return 0
        step = self.work.settings.snapshots.every_nights
        return max(0, round((self.night - self.previous.night).days / step) - 1)

    @cached_property
    def held(self) -> tuple[NightRow, ...]:
        """The held nights since the last accepted one, in date order."""
        since = self.previous.night if self.previous else date.min
        rows = self.work.store.nights(self.work.network)
        return tuple(row for row in rows if since < row.night < self.night and row.state == "held")

    @property
    def last_seen(self) -> date | None:
        """The last night before this one with any usable snapshot, held ones too."""
        rows = [*self.accepted[-1:], *self.held[-1:]]
        return max((row.night for row in rows), default=None)

    def book(self) -> LinkBook | None:
        """The link book of the previous accepted night."""
        if self.previous is None:
            return None
        return self.work.store.record(LinkBook, self.work.network, self.previous.night, kind="book")

    def known(self) -> dict[str, Ids] | None:
        """Every node ever in an effective snapshot (columns id, first_night), or None on the first night."""
        if self.previous is None:
            return None
        return self.work.store.part(self.work.network, self.previous.night, kind="known")

    def held_snapshots(self) -> list[Snapshot]:
        """The held raw snapshots directly before this night, oldest first."""
        rows = self.held[-HELD_IN_A_ROW:]
        return [self.work.store.record(Snapshot, self.work.network, row.night, kind="raw") for row in rows]

    @cached_property
    def _judged(self) -> list[tuple[Profile, Verdict]]:
        nights = [row.night for row in self.accepted[-LOOK_BACK:]]
        store, network = self.work.store, self.work.network
        verdicts = store.records(Verdict, network, nights, kind="verdict")
        return [
            (profile, verdicts[night])
            for night, profile in store.records(Profile, network, nights, kind="profile").items()
        ]

    @property
    def baseline_profiles(self) -> list[Profile]:
        """Profiles of the accepted nights since the last change of baseline, oldest first, at most 14."""
        return trailing_profiles(self._judged)[0]

    @property
    def fine_profiles(self) -> list[Profile]:
        """Profiles of the last nights that were accepted as fine, oldest first, at most 14."""
        return trailing_profiles(self._judged)[1]


def history_of(work: Work, night: date) -> History:
    """The history that a night rests on."""
    return History(work, night)
