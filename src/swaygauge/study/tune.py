"""The attenuation study of a network's stored nights: load, solve, measure, recommend."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from datetime import date
from typing import Any

from swaygauge.errors import ScoreError
from swaygauge.night.work import Work
from swaygauge.records import SpectralBounds
from swaygauge.scores import SCORES
from swaygauge.study.attenuation import BUYERS, FROM_FAR, MOVED, SHARES, Measured, follow, measure, persistence_of
from swaygauge.study.nights import bounds_over, load_night, night_row, quiet_pairs
from swaygauge.study.recommend import Recommendation, recommend
from swaygauge.study.setting import settings_of

LAMBDA_NIGHTS = 28  # accepted nights over which the rise of lambda is looked at


@dataclass(frozen=True)
class Tuned:
    """The study's result."""

    network: str
    night: date
    top: int
    quiet: tuple[tuple[date, date], ...]
    bounds: SpectralBounds  # on lambda, on every night solved
    rise: float  # largest proven rise of lambda from one night to a later one, as a ratio
    rise_nights: int
    rows: tuple[Measured, ...]
    advice: tuple[Recommendation, ...]

    def as_json(self) -> dict[str, Any]:
        """Plain values, with what each number means where its name does not say it."""
        meaning = {
            "overlap": f"rank-biased overlap of the first {self.top} places, p = {persistence_of(self.top):.3f}",
            "quiet_octaves": "mean |log2 ratio of places| a night, nodes in either night's top",
            "quiet_moved": f"such nodes that moved by a ratio of {MOVED} or more, mean a night",
            "price": f"median of {BUYERS} nodes near place {FROM_FAR * self.top}: fresh one-link endorsers to the top",
        }
        return asdict(self) | {"meaning": meaning}


def top_of(wanted: int, nodes: int) -> int:
    """The places studied: a tenth of the nodes at most, so that there are nodes well below to price."""
    return max(1, min(wanted, nodes // 10))


def tune(work: Work, night: date | None, *, top: int | None = None, quiet: int = 10) -> Tuned:
    """Study a night (the newest scored one by default) and the ``quiet`` newest quiet pairs of nights up to it.

    Every graph is solved once per setting. Raises NotInStore; ScoreError when the network is too small to have a top
    and a node outside it. A setting that cannot be solved is a row with its problem, not an error.
    """
    row = night_row(work, night)
    pairs = quiet_pairs(work, row.night, count=quiet)
    nights = sorted({row.night, *(each for pair in pairs for each in pair)})
    bounds = bounds_over(work, nights)
    scores = work.settings.scores
    options = {name: getattr(scores, name) for name in SCORES}
    assert row.alpha is not None
    shares = {
        "katz": tuple(sorted({*SHARES, scores.katz.share})),
        "fairshare": tuple(sorted({*SHARES, scores.fairshare.alpha})),
    }
    present = {"katz": row.alpha, "fairshare": scores.fairshare.alpha}
    settings = [each for name in SCORES for each in settings_of(name, shares[name], bounds, present=present[name])]
    studied = load_night(work, row.night)
    if studied.graph.n < 10:
        raise ScoreError(f"{work.network}: {studied.graph.n} nodes are too few to study, expected 10 or more.")
    places = top_of(top or scores.top, studied.graph.n)
    graphs = (studied if each == row.night else load_night(work, each) for each in nights)
    courses = follow(graphs, settings, options=options, quiet=pairs, top=places, studied=row.night)
    rows = measure(courses, studied, options=options, top=places)
    rise, rise_nights = lambda_rise(work, row.night)
    advice = tuple(
        recommend(
            rows,
            score=name,
            shares=shares[name],
            quiet=len(pairs),
            rise=rise,
            configured=scores.katz.share if name == "katz" else scores.fairshare.alpha,
            limit=scores.katz.limit if name == "katz" and bounds.upper > 0.0 else None,
        )
        for name in SCORES
    )
    return Tuned(work.network, row.night, places, tuple(pairs), bounds, rise, rise_nights, tuple(rows), advice)


def lambda_rise(work: Work, night: date) -> tuple[float, int]:
    """(largest rise of lambda's upper bound from one night to a later one, as a ratio; nights looked at)."""
    rows = [row for row in work.store.nights(work.network) if row.accepted and row.night <= night][-LAMBDA_NIGHTS:]
    uppers = [row.lambda_upper for row in rows if row.lambda_upper]
    rise, least = 1.0, float("inf")
    for upper in uppers:
        least = min(least, upper)
        rise = max(rise, upper / least)
    return rise, len(rows)
