"""What every kind of alert looks at, derived once per night: who moved, by how much, and what is usual for them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from swaygauge.detect.counts import CountModel, Surprise, measure_surprise, model_counts
from swaygauge.detect.following import DriftStep, advance_sums
from swaygauge.detect.inputs import NightInputs
from swaygauge.detect.state import DetectorState
from swaygauge.detect.thresholds import Thresholds
from swaygauge.detect.view import LinkCounts, ScoreView, count_changes, lay_out
from swaygauge.records import Flags, Ints, LinkBook, LinkChanges


@dataclass(frozen=True)
class Picture:
    """One accepted night, ready to be judged. ``state`` is the state before it."""

    inputs: NightInputs
    thresholds: Thresholds
    state: DetectorState
    book: LinkBook
    changes: LinkChanges
    in_degree_before: Ints
    present: Flags  # (nodes,) has a link in effect tonight
    links: LinkCounts
    gains: CountModel
    losses: CountModel
    surprise: Surprise
    views: dict[str, ScoreView]
    step: DriftStep  # the sums behind drift after tonight
    quiet: bool  # too little history for surge and drift
    new_baseline: bool  # coverage changed or held nights became the baseline: no node-level alerts
    first: bool  # nothing to compare with

    @property
    def provisional(self) -> bool:
        """Whether the history is still short."""
        return self.inputs.history < self.thresholds.provisional_until


def take_picture(inputs: NightInputs, state: DetectorState, thresholds: Thresholds) -> Picture:
    """Derive all of it. Raises ValueError when the inputs of a scored night are incomplete."""
    book, changes = inputs.book, inputs.changes
    if book is None or changes is None or inputs.in_degree_before is None:
        raise ValueError(f"{inputs.night}: a scored night needs its book, changes and in_degree_before.")
    nodes = inputs.nodes
    in_degree_before = np.pad(inputs.in_degree_before, (0, nodes - len(inputs.in_degree_before)))
    links = count_changes(changes, nodes)
    present = np.zeros(nodes, np.bool_)
    in_effect = book.in_effect
    present[book.source[in_effect]] = True
    present[book.target[in_effect]] = True
    standing = in_degree_before.astype(np.float64)
    attention = np.where(present, standing + 1.0, 0.0)  # attention goes where endorsements are; nobody is beyond it
    gains = model_counts(state.gains, links.new, attention)
    losses = model_counts(state.losses, links.lost, standing)
    views = {name: lay_out(moves, nodes, inputs.watch_ids, thresholds) for name, moves in sorted(inputs.moves.items())}
    quiet, first = inputs.history < thresholds.quiet_history, inputs.previous is None
    new_baseline = inputs.verdict.starts_baseline
    step = advance_sums(
        views,
        state,
        number=inputs.history,
        running=not (quiet or first or new_baseline),
        links=links,
        due=gains.due,
        watch_ids=inputs.watch_ids,
        thresholds=thresholds,
    )
    return Picture(
        inputs=inputs,
        thresholds=thresholds,
        state=state,
        book=book,
        changes=changes,
        in_degree_before=in_degree_before,
        present=present,
        links=links,
        gains=gains,
        losses=losses,
        surprise=measure_surprise(gains, losses, present, state.tails),
        views=views,
        step=step,
        quiet=quiet,
        new_baseline=new_baseline,
        first=first,
    )
