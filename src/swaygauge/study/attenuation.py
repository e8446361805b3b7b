"""What the share of 1/lambda does to a ranking: how it changes, moves on quiet nights, concentrates, what it costs."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import date

import numpy as np

from swaygauge.errors import ScoreError
from swaygauge.moves import rank_biased_overlap
from swaygauge.records import Floats, Ids
from swaygauge.scores import Solution
from swaygauge.scores.ranks import rank_places
from swaygauge.study.nights import NightGraph
from swaygauge.study.price import buyers, price_of_place
from swaygauge.study.setting import Options, Setting

SHARES = (0.5, 0.6, 0.7, 0.8, 0.85, 0.9, 0.95)
MOVED = 1.25  # ratio of places from which a move counts, as in the detection of surges
BUYERS = 5  # nodes that the price is the median of
FROM_FAR = 5  # they stand at this many times the places of the top


@dataclass(frozen=True)
class Measured:
    """One setting, measured. Numbers are None where they could not be had; ``problem`` says why nothing could."""

    setting: Setting
    problem: str = ""
    overlap_below: float | None = None  # rank-biased overlap with the setting of the next smaller share
    step: float | None = None  # by which that share is smaller
    overlap_present: float | None = None  # ... with the present setting
    quiet_octaves: float | None = None  # mean |octaves| a night of nodes in either night's top, over quiet nights
    quiet_error: float | None = None  # standard error of that mean, from the spread of the nights' own means
    quiet_moved: float | None = None  # how many of them moved by a ratio of MOVED or more, mean a night
    top_share: float | None = None  # part of the sum of all values that the top holds
    gini: float | None = None
    price: float | None = None  # median number of fresh endorsers to a place in the top; None: not to be had that way
    prices: tuple[int | None, ...] = ()  # of each buyer
    confirmed: bool = True  # every price was confirmed by solving again
    error: float | None = None  # largest proven bound / value
    sweeps: int | None = None


@dataclass(frozen=True, eq=False)
class Ranked:
    """What is kept of a night under one setting."""

    ids: Ids
    rank: Ids


@dataclass
class Course:
    """One setting followed over the nights of a study."""

    setting: Setting
    last: tuple[date, Ranked] | None = None
    octaves: list[Floats] = field(default_factory=list)
    problem: str = ""
    on_the_night: Solution | None = None


def persistence_of(top: int) -> float:
    """The persistence of rank-biased overlap: 1 - 5 / top, so that 99 % of the weight lies on the top; at least 1/2."""
    return max(0.5, 1.0 - 5.0 / top)


def top_octaves(before: Ranked, now: Ranked, *, top: int) -> Floats:
    """|log2 of the ratio of places| of each node present on both nights and in the top of either."""
    _, at_before, at_now = np.intersect1d(before.ids, now.ids, assume_unique=True, return_indices=True)
    was, is_now = before.rank[at_before], now.rank[at_now]
    in_top = np.minimum(was, is_now) <= top
    octaves: Floats = np.abs(np.log2(was[in_top] / is_now[in_top]))
    return octaves


def gini_of(value: Floats) -> float:
    """Gini's coefficient of concentration, 0 = all equal, towards 1 = one holds everything.

    >>> gini_of(np.array([1.0, 1.0, 1.0, 1.0])), gini_of(np.array([0.0, 0.0, 0.0, 1.0]))
    (0.0, 0.75)
    """
    n = len(value)
    total = float(value.sum())
    if n == 0 or total == 0.0:
        return 0.0
    lorenz = float(np.sum((2.0 * np.arange(1, n + 1) - n - 1.0) * np.sort(value)))
    return max(0.0, lorenz / (n * total))


def follow(
    nights: Iterable[NightGraph],
    settings: Sequence[Setting],
    *,
    options: Mapping[str, Options],
    quiet: Sequence[tuple[date, date]],
    top: int,
    studied: date,
) -> list[Course]:
    """Solve every night under every setting, in date order; one graph is in memory at a time.

    A setting that cannot be solved on some night is given up there, with the reason as its ``problem``. Returns the
    courses in the order of ``settings``, with the solutions of the night ``studied``.
    """
    courses = [Course(setting) for setting in settings]
    compared = set(quiet)
    for night in nights:
        for course in courses:
            if not course.problem:
                _take_in(course, night, options[course.setting.score], compared, top, studied)
    return courses


def _take_in(
    course: Course, night: NightGraph, options: Options, compared: set[tuple[date, date]], top: int, studied: date
) -> None:
    score = course.setting.score
    try:
        solution = course.setting.solve(night.graph, options=options, beta=night.beta[score])
    except ScoreError as error:
        course.problem = f"night {night.night}: {error}"
        course.last = course.on_the_night = None
        return
    ranked = Ranked(night.ids, rank_places(solution.value, solution.bound)[0])
    if course.last is not None and (course.last[0], night.night) in compared:
        course.octaves.append(top_octaves(course.last[1], ranked, top=top))
    course.last = night.night, ranked
    if night.night == studied:
        course.on_the_night = solution


def measure(
    courses: Sequence[Course], night: NightGraph, *, options: Mapping[str, Options], top: int
) -> list[Measured]:
    """The table of the study: one row per course, in their order, neighbours compared within a score."""
    rows: list[Measured] = []
    ranks = {id(course): _rank(course) for course in courses}
    present = {course.setting.score: ranks[id(course)] for course in courses if course.setting.present}
    below: dict[str, tuple[float, Ids]] = {}
    for course in courses:
        score, rank = course.setting.score, ranks[id(course)]
        row = _row(course, night, options[score], top)
        if rank is not None:
            here = present.get(score)
            row = replace(
                row,
                overlap_below=_overlap(below[score][1], rank, top) if score in below else None,
                step=course.setting.share - below[score][0] if score in below else None,
                overlap_present=None if here is None else _overlap(here, rank, top),
            )
            below[score] = course.setting.share, rank
        rows.append(row)
    return rows


def _rank(course: Course) -> Ids | None:
    solution = course.on_the_night
    return None if solution is None else rank_places(solution.value, solution.bound)[0]


def _overlap(one: Ids, other: Ids, top: int) -> float:
    return rank_biased_overlap(one, other, one, other, depth=top, persistence=persistence_of(top))


def _row(course: Course, night: NightGraph, options: Options, top: int) -> Measured:
    setting, solution = course.setting, course.on_the_night
    if solution is None:
        return Measured(setting, course.problem)
    value = solution.value
    try:
        prices = [
            price_of_place(
                night.graph,
                setting,
                solution,
                options=options,
                beta=night.beta[setting.score],
                node=node,
                rank=top,
                weight=night.weight,
            )
            for node in buyers(value, around=FROM_FAR * top, count=BUYERS)
        ]
    except ScoreError as error:
        return Measured(setting, f"night {night.night}, price of a place: {error}")
    octaves = course.octaves
    nightly = np.array([each.mean() for each in octaves if len(each)])
    number = [np.inf if price.endorsers is None else price.endorsers for price in prices]
    middle = float(np.median(number)) if number else np.inf
    return Measured(
        setting,
        quiet_octaves=float(nightly.mean()) if len(nightly) else None,
        quiet_error=float(nightly.std(ddof=1) / np.sqrt(len(nightly))) if len(nightly) > 1 else None,
        quiet_moved=float(np.mean([np.count_nonzero(each >= np.log2(MOVED)) for each in octaves])) if octaves else None,
        top_share=float(np.sort(value)[::-1][:top].sum() / value.sum()),
        gini=gini_of(value),
        price=middle if np.isfinite(middle) else None,
        prices=tuple(price.endorsers for price in prices),
        confirmed=all(price.confirmed for price in prices if price.endorsers is not None),
        error=float(np.max(solution.bound[value > 0.0] / value[value > 0.0])),
        sweeps=solution.sweeps,
    )
