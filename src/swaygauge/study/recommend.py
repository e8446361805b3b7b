"""From the measured table to one share, with the reasons for it.

Among the settings that could be solved everywhere, a larger share makes places dearer for fresh accounts and lets the
standing of endorsers count for more; a smaller one is calmer, and leaves lambda room to grow before an era ends. The
rule takes the largest share of the grid that

* leaves room (katz): lambda may rise again as it did over the nights looked at without ending the era,
* is calm: quiet nights move its top at most CALM times as much as the calmest setting's,
* is settled: the overlap of its ranking with that of the next smaller setting is at least SETTLED, for a step of STEP
  (in proportion for other steps, so that a finer grid does not make every setting look settled).

The two limits are a convention, not a law: they are named in the reasons, and the table shows what else could be had.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from swaygauge.study.attenuation import Measured

CALM = 1.25
SETTLED = 0.95
STEP = 0.05
LEAST_NIGHTS = 3  # quiet nights below which movement is hearsay


@dataclass(frozen=True)
class Recommendation:
    """A share for one score, or None with the reason why none is named."""

    score: str
    share: float | None
    reasons: tuple[str, ...]


def recommend(
    rows: Sequence[Measured],
    *,
    score: str,
    shares: Sequence[float],
    quiet: int,
    rise: float,
    configured: float,
    limit: float | None,
) -> Recommendation:
    """The recommended share of a score.

    rows: the table. shares: those of the grid that settings can name (the present alpha may stand between them).
    quiet: quiet nights that movement was measured on. rise: largest growth of lambda over the nights looked at, as a
    ratio. configured: the share the settings ask for. limit: alpha * lambda at which an era ends; None: no eras.
    """
    solved = [row for row in rows if row.setting.score == score and not row.problem]
    grid = [row for row in solved if any(abs(row.setting.share - share) < 1e-9 for share in shares)]
    left_out = [row for row in rows if row.setting.score == score and row.problem]
    notes = [f"share {row.setting.share:.3g} is out: it could not be solved ({row.problem})." for row in left_out]
    if quiet < LEAST_NIGHTS or not grid:
        why = (
            f"movement was measured on {quiet} quiet night(s), fewer than {LEAST_NIGHTS}"
            if grid
            else "nothing was solved"
        )
        return Recommendation(score, None, (*notes, f"no share is recommended: {why}."))
    calmest = min(row.quiet_octaves for row in grid if row.quiet_octaves is not None)
    tests: list[tuple[Callable[[Measured], bool], str]] = [
        (
            lambda row: _of(row.quiet_octaves) <= CALM * calmest,
            f"moves more than {CALM} times the calmest setting on quiet nights",
        ),
        (
            _is_settled,
            f"its ranking overlaps the next smaller setting's by less than {SETTLED} for a step of {STEP}",
        ),
    ]
    if limit is not None:
        tests.insert(
            0,
            (
                lambda row: row.setting.share * rise <= limit,
                f"a rise of lambda like the {rise - 1:.1%} seen would end the era (limit {limit:.2f})",
            ),
        )
    fit = [row for row in grid if all(test(row) for test, _ in tests)]
    chosen = fit[-1] if fit else min(grid, key=lambda row: _of(row.quiet_octaves))
    if fit:
        reasons = [f"the largest share tried that passes every test; {_told(chosen)}."]
    else:
        reasons = [f"no share passes every test; this is the calmest, no more is claimed; {_told(chosen)}."]
    for row in grid[grid.index(chosen) + 1 :]:
        failed = "; ".join(text for test, text in tests if not test(row))
        reasons.append(f"{row.setting.share:.3g} is not taken: {failed}.")
    if chosen is grid[-1] and len(grid) > 1:
        reasons.append("it is the largest share that was tried and solved: what lies beyond was not measured.")
    reasons += _against_present(chosen, solved, configured=configured)
    return Recommendation(score, chosen.setting.share, (*notes, *reasons))


def _is_settled(row: Measured) -> bool:
    if row.overlap_below is None or row.step is None:
        return True
    return 1.0 - row.overlap_below <= (1.0 - SETTLED) * row.step / STEP


def _of(octaves: float | None) -> float:
    return float("inf") if octaves is None else octaves


def _told(row: Measured) -> str:
    error = "" if row.quiet_error is None else f" (standard error {row.quiet_error:.4f})"
    price = "no number of fresh endorsers buys" if row.price is None else f"{row.price:.0f} fresh endorsers buy"
    held = "" if row.top_share is None else f", the top holds {row.top_share:.1%} of all value"
    return f"its top moves {_of(row.quiet_octaves):.4f} octaves on a quiet night{error}, {price} a place in it{held}"


def _against_present(chosen: Measured, solved: Sequence[Measured], *, configured: float) -> list[str]:
    """What the present setting costs or gains beside the chosen one, and whether settings would have to change."""
    told = []
    if abs(chosen.setting.share - configured) < 1e-9:
        told.append("it is the share that the settings ask for: nothing has to change.")
    else:
        when = "with a new era or a replay of all nights" if chosen.setting.score == "katz" else "on the next night"
        told.append(f"the settings ask for {configured:.3g}; a change takes effect {when}.")
    present = next((row for row in solved if row.setting.present), None)
    if present is None:
        return [*told, "the present alpha could not be solved on every night looked at."]
    if present.setting == chosen.setting:
        return told
    words = [f"the alpha in use now is a share of {present.setting.share:.3g}: {_told(present)}"]
    if chosen.quiet_octaves and present.quiet_octaves is not None:
        words.append(f"it moves {present.quiet_octaves / chosen.quiet_octaves:.2f} times as much")
    if chosen.price and present.price is not None:
        words.append(f"a place costs {present.price / chosen.price:.2f} times as many endorsers")
    if chosen.overlap_present is not None:
        words.append(f"the two rankings overlap by {chosen.overlap_present:.3f}")
    return [*told, "; ".join(words) + "."]
