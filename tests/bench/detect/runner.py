"""Nights in a row through the detector, without a store: the functions that the stages of a night call, in their order.

A test runs the same files through the store and through here and expects the same alerts.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field
from datetime import date
from typing import Any

import numpy as np
from plain_rules import run_plain_rules

from swaygauge.checks.limits import Limits
from swaygauge.checks.profile import measure
from swaygauge.checks.verdict import judge
from swaygauge.detect import DetectorState, NightInputs, Thresholds, detect, missing_nights
from swaygauge.detect.guard import choose_tail
from swaygauge.detect.picture import take_picture
from swaygauge.effective import UpkeepOptions, advance, comparable_before, start_book
from swaygauge.moves import compare_scores
from swaygauge.night.steps import (
    LOOK_BACK,
    compared_inputs,
    era_pin,
    first_inputs,
    graph_of,
    known_now,
    settled,
    solve_scores,
    trailing_profiles,
)
from swaygauge.records import (
    Alert,
    Floats,
    Ids,
    LinkBook,
    Pin,
    Profile,
    ScoreSet,
    Snapshot,
    SpectralBounds,
    Verdict,
)
from swaygauge.scores import FairshareOptions, KatzOptions
from swaygauge.scores.spectrum import bound_lambda


@dataclass(frozen=True)
class Options:
    """The settings of a night that matter here."""

    network: str = "bench"
    limits: Limits = field(default_factory=Limits)
    upkeep: UpkeepOptions = field(default_factory=UpkeepOptions)
    katz: KatzOptions = field(default_factory=KatzOptions)
    fairshare: FairshareOptions = field(default_factory=FairshareOptions)
    thresholds: Thresholds = field(default_factory=Thresholds)

    @property
    def scores(self) -> dict[str, KatzOptions | FairshareOptions]:
        """By score."""
        return {"katz": self.katz, "fairshare": self.fairshare}


@dataclass(frozen=True)
class Accepted:
    """What stays of the last accepted night."""

    night: date
    book: LinkBook
    bounds: SpectralBounds
    pin: Pin
    scores: dict[str, ScoreSet]
    known: dict[str, Ids]
    state: DetectorState


@dataclass(frozen=True)
class Told:
    """One night's outcome."""

    night: date
    verdict: Verdict
    alerts: tuple[Alert, ...]
    present: int  # nodes scored; 0 on a held night
    p: Floats  # surge's p of every node that had a link change; empty unless asked for
    state: DetectorState | None


@dataclass
class Desk:
    """One network's nights so far."""

    options: Options = field(default_factory=Options)
    with_p: bool = False
    last: Accepted | None = None
    judged: list[tuple[Profile, Verdict]] = field(default_factory=list)
    held: list[Snapshot] = field(default_factory=list)  # since the last accepted night
    accepted: int = 0

    def pass_night(self, snapshot: Snapshot, nodes: int) -> Told:
        """Check, prepare, score and compare one snapshot; ``nodes`` is the length of the name table by then."""
        last, options = self.last, self.options
        verdict = self._verdict(snapshot)
        common: dict[str, Any] = {
            "network": options.network,
            "night": snapshot.night,
            "verdict": verdict,
            "history": self.accepted,
            "nodes": nodes,
            "previous": last.night if last else None,
            "last_seen": self.held[-1].night if self.held else last.night if last else None,
            "gap_nights": missing_nights(last.night, snapshot.night) if last else 0,
        }
        if verdict.outcome == "hold":
            self.held.append(snapshot)
            alerts, _ = detect(NightInputs(**common), last.state if last else None, options.thresholds)
            return Told(snapshot.night, verdict, alerts, 0, np.empty(0), None)
        now, inputs = self._scored(snapshot, common)
        alerts, state = detect(inputs, last.state if last else None, options.thresholds)
        p = self._p(inputs) if self.with_p and last else np.empty(0)
        self.last = Accepted(**now, state=state)
        self.held, self.accepted = [], self.accepted + 1
        return Told(snapshot.night, verdict, alerts, len(now["scores"]["katz"].ids), p, state)

    def _verdict(self, snapshot: Snapshot) -> Verdict:
        last, limits = self.last, self.options.limits
        baseline, fine = trailing_profiles(self.judged[-LOOK_BACK:])
        known = last.known["id"] if last else None
        profile = measure(snapshot, last.book if last else None, trailing=baseline, known_nodes=known)
        verdict = judge(profile, limits, fine_nights=fine, run=run_plain_rules)
        verdict = settled(verdict, snapshot, self.held[-2:], limits=limits)
        if verdict.outcome != "hold":
            self.judged.append((profile, verdict))
        return verdict

    def _scored(self, snapshot: Snapshot, common: dict[str, Any]) -> tuple[dict[str, Any], NightInputs]:
        last, options, night = self.last, self.options, snapshot.night
        if last is None:
            book = start_book(snapshot)
        else:
            book, changes, upkeep = advance(last.book, snapshot, common["verdict"], options=options.upkeep)
        scored = graph_of(book)
        bounds = bound_lambda(scored.graph)
        pin, _ = era_pin(
            last.pin if last else None, last.bounds if last else None, bounds, night=night, options=options.katz
        )
        now: dict[str, Any] = {"night": night, "book": book, "bounds": bounds, "pin": pin}
        now |= {"scores": self._solve(night, book, pin), "known": known_now(night, last.known if last else None, book)}
        if last is None:
            return now, first_inputs(common, book, bounds)
        adjusted = comparable_before(last.book, changes)
        base = last.book if adjusted is None else adjusted
        then, rescored = last.scores, False
        if adjusted is not None or any(then[name].alpha != now["scores"][name].alpha for name in then):
            then, rescored = self._solve(last.night, base, pin), True
        inputs = compared_inputs(
            common,
            book,
            changes,
            base=base,
            bounds_before=last.bounds if adjusted is None else bound_lambda(graph_of(adjusted).graph),
            bounds=bounds,
            thresholds=options.thresholds,
            upkeep=upkeep,
            moves={name: compare_scores(then[name], now["scores"][name]) for name in then},
            rescored=rescored,
        )
        return now, inputs

    def _solve(self, night: date, book: LinkBook, pin: Pin) -> dict[str, ScoreSet]:
        options = self.options.scores
        beta = {name: option.beta for name, option in options.items()}
        return solve_scores(night, graph_of(book), pin, options=options, beta=beta)

    def _p(self, inputs: NightInputs) -> Floats:
        assert self.last is not None
        thresholds = self.options.thresholds
        picture = take_picture(inputs, self.last.state.fitted(inputs.nodes, thresholds), thresholds)
        p: Floats = picture.surprise.p[choose_tail(picture.state.guard, thresholds.tail_guard)]
        return np.empty(0) if picture.quiet or picture.new_baseline else p


def run_series(
    snapshots: Iterable[tuple[Snapshot, int]], options: Options | None = None, *, with_p: bool = False
) -> Iterator[Told]:
    """Alerts per night of snapshots in date order, each with the length of the name table by then."""
    desk = Desk(options or Options(), with_p=with_p)
    for snapshot, nodes in snapshots:
        yield desk.pass_night(snapshot, nodes)
