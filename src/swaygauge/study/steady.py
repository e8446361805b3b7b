"""The steadiness study of one stored night: measure the flicker, work out the noise, check it by resampling."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from typing import Any

import numpy as np

from swaygauge.errors import NotInStore
from swaygauge.night.work import Work
from swaygauge.scores import SCORES
from swaygauge.scores.ranks import rank_places
from swaygauge.study.nights import Flicker, flicker_of, load_night, night_row
from swaygauge.study.resampling import NORMAL, Check, draws_for, resample
from swaygauge.study.setting import Setting
from swaygauge.study.steadiness import Noise, crawl_noise


@dataclass(frozen=True, eq=False)
class Steady:
    """The study's result for one score."""

    score: str
    alpha: float
    noise: Noise
    node_ids: tuple[int, ...]  # of noise.nodes
    check: Check


@dataclass(frozen=True, eq=False)
class Steadiness:
    """The study's result."""

    network: str
    night: date
    links: int
    flicker: Flicker | None  # None when a person gave the rate
    rate: float
    seed: int
    scores: tuple[Steady, ...]

    def as_json(self, names: dict[int, str]) -> dict[str, Any]:
        """Plain values; names: node id -> name."""
        flicker = self.flicker
        return {
            "network": self.network,
            "night": self.night,
            "links": self.links,
            "rate": self.rate,
            "rate_measured_on_nights": flicker.nights if flicker else None,
            "rate_lowest_night": flicker.lowest if flicker else None,
            "rate_highest_night": flicker.highest if flicker else None,
            "seed": self.seed,
            "scores": [_score_json(each, names) for each in self.scores],
        }


def _score_json(steady: Steady, names: dict[int, str]) -> dict[str, Any]:
    noise, check = steady.noise, steady.check
    return {
        "score": steady.score,
        "alpha": steady.alpha,
        "band": f"range of places over {noise.draws} random-sign draws of the delta method",
        "resampled": check.draws,
        "inside": float(check.inside.mean()),
        "beyond_sd": [{"sd": c, "share": share, "normal_law": NORMAL[c]} for c, share in check.beyond.items()],
        "nodes": [
            {
                "place": int(noise.rank[at]),
                "first": int(noise.first[at]),
                "last": int(noise.last[at]),
                "name": names[node],
                "value_sd": float(noise.sd[at]),
                "value_sd_resampled": float(check.spread[at]),
                "expected_value": float(noise.expected[at]),
                "inside": float(check.inside[at]),
            }
            for at, node in enumerate(steady.node_ids)
        ],
    }


def steadiness(
    work: Work,
    night: date | None,
    *,
    top: int | None = None,
    rate: float | None = None,
    draws: int | None = None,
    seed: int = 0,
) -> Steadiness:
    """Study the first ``top`` places of a night (the newest scored one by default) under both scores.

    rate: the flicker rate; None measures it. draws: of the resampling run; None takes as many as the size allows. Same
    store, same seed, same result. Raises NotInStore, ScoreError, NotConverged.
    """
    row = night_row(work, night)
    flicker = flicker_of(work, row.night) if rate is None else None
    used = rate if flicker is None else flicker.rate
    assert used is not None
    if used == 0.0:
        raise NotInStore(
            f"{work.network}: no link of a fetched source was missing on the {flicker.nights if flicker else 0} fine "
            "nights looked at, so there is no crawl noise to study. Give a rate with --rate, for example 0.005."
        )
    studied = load_night(work, row.night)
    scores = work.settings.scores
    assert row.alpha is not None
    told = []
    for name, alpha in (("katz", row.alpha), ("fairshare", scores.fairshare.alpha)):
        setting, options, beta = Setting(name, 0.0, alpha), getattr(scores, name), studied.beta[name]
        solution = setting.solve(studied.graph, options=options, beta=beta)
        noise = crawl_noise(
            studied.graph,
            setting,
            solution.value,
            options=options,
            rank=rank_places(solution.value, solution.bound)[0],
            top=top or scores.top,
            rate=used,
            seed=seed,
        )
        number = draws or draws_for(studied.graph.m)
        check = resample(studied.graph, setting, noise, options=options, beta=beta, draws=number, seed=seed)
        told.append(Steady(name, alpha, noise, tuple(int(each) for each in studied.ids[noise.nodes]), check))
    assert set(SCORES) == {each.score for each in told}
    return Steadiness(work.network, row.night, studied.graph.m, flicker, used, seed, tuple(told))


def ordinary_width(noise: Noise) -> float:
    """Median number of places in a band."""
    return float(np.median(noise.last - noise.first + 1))
