"""From series to the table of what must be, what is aimed at, and what was measured."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from bench.detect.plans import BAD_FROM, BAD_NIGHTS, FIRST_EVENT, MODELS, Model
from bench.detect.series import LEVELS, ONE_LINK, STORY_LINKS, AlertSeen, EventSeen, NightSeen, SeriesSeen

AGAIN_NIGHTS: Final = 7
RETURN_NIGHTS: Final = 3  # from the first night after bad ones
FALLS: Final = ("fell", "left")
FALL_FAULTS: Final = ("15% missing", "40% missing", "capped")


@dataclass(frozen=True)
class Row:
    """One figure. Met when at least (``floor``) or at most the must."""

    quantity: str
    model: str
    measured: float | None  # None: not built, or nothing to measure it on
    must: float
    aim: float
    floor: bool
    count: int = 0  # of cases the figure rests on
    note: str = ""

    @property
    def state(self) -> str:
        """In one word."""
        if self.measured is None:
            return self.note or "no case"
        good = (lambda limit: self.measured >= limit) if self.floor else (lambda limit: self.measured <= limit)
        return "aim" if good(self.aim) else "must" if good(self.must) else "MISSED"


@dataclass(frozen=True)
class Part:
    """The series of one model, at the usual volume and with the usual faults unless said otherwise."""

    events: Sequence[SeriesSeen]
    quiet: Sequence[SeriesSeen]
    bad: Sequence[SeriesSeen]

    @property
    def quiet_nights(self) -> list[tuple[SeriesSeen, NightSeen]]:
        """Scored nights of quiet series that the detector had its history for and the crawl did not fail on."""
        return [(s, night) for s in self.quiet for night in counted(s) if not night.fault and night.outcome != "hold"]


def counted(series: SeriesSeen) -> list[NightSeen]:
    """The nights that are judged."""
    return [night for night in series.nights if night.number >= FIRST_EVENT]


def part_of(series: Sequence[SeriesSeen], model: Model, *, triple: bool = False) -> Part:
    """The series of one model."""
    own = [s for s in series if s.plan.model == model and s.plan.triple == triple]
    usual = [s for s in own if s.plan.faults == "usual"]
    return Part(
        events=[s for s in usual if s.plan.events],
        quiet=[s for s in usual if not s.plan.events],
        bad=[s for s in own if s.plan.faults != "usual"],
    )


def rows(series: Sequence[SeriesSeen], *, rerun_same: bool | None) -> list[Row]:
    """The whole table."""
    table = [row for model in MODELS for row in _rows(part_of(series, model), model)]
    same = None if rerun_same is None else float(rerun_same)
    return [*table, Row("re-run from the same snapshots is byte-identical", "both", same, 1, 1, True)]


def _rows(part: Part, model: Model) -> Iterable[Row]:
    alike = model == "alike"

    def pick(of_alike: float, of_unlike: float) -> float:
        return of_alike if alike else of_unlike

    material = [event for s in part.events for event in s.events if event.material]
    big = [event for event in material if event.octaves >= 1.0]
    yield _recall("recall, material events of >= 2x", model, big, 0.98, 1.0)
    yield _recall("recall, material events of >= 1.5x", model, material, 0.96, 0.99)
    yield _recall("recall, one-link events of >= 1.5x", model, [e for e in material if e.event in ONE_LINK], 0.80, 0.90)

    nights = part.quiet_nights
    surges = [(night, alert) for _, night in nights for alert in night.alerts if alert.kind == "surge"]
    false = sum(not (alert.story or alert.burst >= STORY_LINKS) for _, alert in surges)
    yield _mean(
        "surge: false per quiet night, natural bursts of >= 8 links aside",
        model,
        false,
        len(nights),
        pick(0.05, 0.10),
        pick(0.01, 0.05),
    )
    raised = [a for s in part.events for night in counted(s) for a in night.alerts if a.kind == "surge"]
    right = sum(alert.planted or alert.story or alert.burst >= STORY_LINKS for alert in raised)
    yield Row(
        "surge: precision, natural bursts counted right",
        model,
        _share(right, len(raised)),
        pick(0.95, 0.90),
        pick(0.99, 0.97),
        True,
        len(raised),
    )

    numbers = [len(night.alerts) for _, night in nights]
    yield _mean("all alerts of a quiet night, mean", model, sum(numbers), len(nights), pick(2.5, 4), pick(1.5, 2.5))
    tail = float(np.quantile(numbers, 0.95)) if numbers else None
    yield Row("all alerts of a quiet night, 95 %", model, tail, pick(6, 8), pick(4, 5), False, len(nights))

    usual = _mean_falls(night for _, night in nights)
    for fault in FALL_FAULTS:
        hit = [night for s in part.quiet for night in counted(s) if night.fault == fault]
        beyond = max(0.0, _mean_falls(hit) - usual) if hit else None
        yield Row(f"false falls, {fault}, beyond a usual night", model, beyond, 0.5, 0.0, False, len(hit))
    yield from _floods(part, model)

    every = [*part.events, *part.quiet]
    normal = [night for s in every for night in s.nights if night.number and not night.fault and not night.outage]
    faulty = [night for s in every for night in s.nights if night.fault]
    fine = _share(sum(n.outcome == "fine" for n in normal), len(normal))
    caught = _share(sum(n.outcome != "fine" for n in faulty), len(faulty))
    yield Row("verdict: normal nights fine", model, fine, pick(0.99, 0.98), pick(1, 0.995), True, len(normal))
    yield Row("verdict: faults held or repaired", model, caught, 0.99, 1, True, len(faulty))

    again, told = _again(part.quiet)
    yield Row("told again within 7 nights, same direction", model, _share(again, told), 0.10, 0.05, False, told)

    drips = [drip for s in part.events for drip in s.drips if drip.material]
    yield _recall(
        "drip of >= 2 sources a night: recall",
        model,
        [d for d in drips if d.count >= 2],
        pick(0.95, 0.85),
        pick(1, 0.95),
    )
    yield _recall(
        "drip of 1 source a night: recall",
        model,
        [d for d in drips if d.count == 1],
        pick(0.85, 0.60),
        pick(0.95, 0.85),
    )
    late = [d.night + d.delay - d.material_from for d in drips if d.delay >= 0]
    yield Row(
        "drip: median nights after its effect reaches 1.5x",
        model,
        float(np.median(late)) if late else None,
        3,
        2,
        False,
        len(late),
    )
    drifts = sum(alert.kind == "drift" for _, night in nights for alert in night.alerts)
    yield _mean("drift: false per quiet night", model, drifts, len(nights), pick(0.3, 1.3), pick(0.05, 0.5))

    present = sum(night.present for _, night in nights)
    for at, (level, must, aim) in enumerate(zip(LEVELS, (1.0, pick(2, 3)), (1.0, pick(1, 1.5)), strict=True)):
        seen = sum(night.beyond[at] for _, night in nights)
        ratio = seen / (level * present) if present else None
        yield Row(f"p of surge, observed/nominal at {level:g}", model, ratio, must, aim, False, seen)
    for shape in ("fresh", "tied to the core", "of existing accounts"):
        yield Row(f"ring {shape}: others' scores moved, against none", model, None, 1.2, 1.2, False, note="not built")
        yield Row(f"ring {shape}: innocent links set aside", model, None, 0, 0, False, note="not built")


def _recall(quantity: str, model: str, events: Sequence[EventSeen], must: float, aim: float) -> Row:
    return Row(quantity, model, _share(sum(e.delay >= 0 for e in events), len(events)), must, aim, True, len(events))


def _mean(quantity: str, model: str, total: float, nights: int, must: float, aim: float) -> Row:
    return Row(quantity, model, total / nights if nights else None, must, aim, False, nights)


def _share(part: int, whole: int) -> float | None:
    return part / whole if whole else None


def _mean_falls(nights: Iterable[NightSeen]) -> float:
    falls = [sum(alert.direction in FALLS and alert.node >= 0 for alert in night.alerts) for night in nights]
    return float(np.mean(falls)) if falls else 0.0


def _floods(part: Part, model: str) -> Iterable[Row]:
    """Alerts about nodes on the nights after bad ones, against the same world without them."""
    calm = {(s.plan.base, s.plan.seed): s for s in part.bad if s.plan.faults == "none"}
    for faults, (_, length) in BAD_NIGHTS.items():
        hit = [s for s in part.bad if s.plan.faults == faults]
        pairs = [(s, calm.get((s.plan.base, s.plan.seed))) for s in hit]
        back = range(BAD_FROM + length, BAD_FROM + length + RETURN_NIGHTS)
        after = sum(_node_alerts(s, back) for s, still in pairs if still)
        before = sum(_node_alerts(still, back) for _, still in pairs if still)
        ratio = after / before if before else None
        note = "" if ratio is not None else "not in the short form" if not calm else "no alert to compare with"
        yield Row(
            f"alerts on the return after: {faults}, against undisturbed", model, ratio, 1.5, 1.0, False, before, note
        )
    yield Row("episodes on the return, against undisturbed", model, None, 1.5, 1.0, False, note="not built")


def _node_alerts(series: SeriesSeen, nights: range) -> int:
    return sum(alert.node >= 0 for night in series.nights if night.number in nights for alert in night.alerts)


def _again(quiet: Sequence[SeriesSeen]) -> tuple[int, int]:
    """Alerts about nodes whose node is told of again the same way within AGAIN_NIGHTS, and all with that many after."""
    again = told = 0
    for series in quiet:
        nights = counted(series)
        said = {(night.number, a.node, a.direction in FALLS) for night in nights for a in night.alerts if a.node >= 0}
        last = nights[-1].number
        for number, node, fell in said:
            if number + AGAIN_NIGHTS <= last:
                told += 1
                again += any((number + later, node, fell) in said for later in range(1, AGAIN_NIGHTS + 1))
    return again, told


def markdown(table: Sequence[Row]) -> str:
    """As a table in Markdown, both models side by side."""
    lines = ["| quantity | model | must | aim | measured | cases | |", "|---|---|---|---|---|---|---|"]
    for row in table:
        sign = ">=" if row.floor else "<="
        measured = "-" if row.measured is None else f"{row.measured:.3g}"
        lines.append(
            f"| {row.quantity} | {row.model} | {sign} {row.must:g} | {sign} {row.aim:g} | {measured} | {row.count} "
            f"| {row.state} |"
        )
    return "\n".join(lines)


def details(series: Sequence[SeriesSeen]) -> str:
    """What the table does not show: by kind, by base, under triple volume, and every event."""
    parts = ["### Quiet nights by network\n", _quiet_by_base(series), "\n### Recall of material events by kind\n"]
    parts += [_recall_by_event(series), "\n### Triple volume (a stress test, no must)\n", _triple(series)]
    parts += ["\n### Bad nights in a row: alerts about nodes\n", _bad_nights(series), "\n### Every event\n"]
    return "\n".join([*parts, *_event_lines(series)])


def _quiet_by_base(series: Sequence[SeriesSeen]) -> str:
    lines = ["| network | model | nights | alerts a night | 95 % | by kind a night |", "|---|---|---|---|---|---|"]
    for model in MODELS:
        nights = part_of(series, model).quiet_nights
        for base in dict.fromkeys(s.plan.base for s, _ in nights):
            own = [night for s, night in nights if s.plan.base == base]
            kinds = Counter(_shown(alert) for night in own for alert in night.alerts)
            shares = ", ".join(f"{kind} {count / len(own):.2f}" for kind, count in kinds.most_common())
            counts = [len(night.alerts) for night in own]
            mean, tail = np.mean(counts), np.quantile(counts, 0.95)
            lines.append(f"| {base} | {model} | {len(own)} | {mean:.2f} | {tail:.0f} | {shares} |")
    return "\n".join(lines)


def _shown(alert: AlertSeen) -> str:
    if alert.kind != "surge":
        return alert.kind
    return "surge (story)" if alert.story else "surge (other burst of >= 8)" if alert.burst >= STORY_LINKS else "surge"


def _recall_by_event(series: Sequence[SeriesSeen]) -> str:
    lines = ["| event | model | material | found | told as | median delay |", "|---|---|---|---|---|---|"]
    for model in MODELS:
        part = part_of(series, model)
        for events in (lambda s: s.events, lambda s: s.drips):
            lines += _by_event([e for s in part.events for e in events(s) if e.material], model)
    return "\n".join(lines)


def _by_event(material: Sequence[EventSeen], model: str) -> list[str]:
    def name(e: EventSeen) -> str:
        return f"{e.event}, {e.count}" if e.count > 2 or e.event == "slow drip" else e.event

    lines = []
    for event in sorted({name(e) for e in material}):
        own = [e for e in material if name(e) == event]
        found = [e for e in own if e.delay >= 0]
        kinds = Counter(e.kinds[0] for e in found)
        told = ", ".join(f"{kind} {count}" for kind, count in kinds.most_common())
        delay = f"{np.median([e.delay for e in found]):g}" if found else "-"
        lines.append(f"| {event} | {model} | {len(own)} | {len(found)} | {told} | {delay} |")
    return lines


def _triple(series: Sequence[SeriesSeen]) -> str:
    part = part_of(series, "unlike", triple=True)
    if not part.events:
        return "Not in the short form."
    figures = [row for row in _rows(part, "unlike") if row.measured is not None]
    lines = ["| quantity | measured | cases |", "|---|---|---|"]
    return "\n".join([*lines, *(f"| {row.quantity} | {row.measured:.3g} | {row.count} |" for row in figures)])


def _bad_nights(series: Sequence[SeriesSeen]) -> str:
    lines = [
        "| network | model | faults | held | nights 24-29 | 30-37 | 38-45 | most in a night |",
        "|---|---|---|---|---|---|---|---|",
    ]
    for s in series:
        if s.plan.faults == "usual":
            continue
        counts = [sum(alert.node >= 0 for alert in night.alerts) for night in s.nights]
        spans = " | ".join(f"{np.mean(counts[low:high]):.1f}" for low, high in ((24, 30), (30, 38), (38, 46)))
        held = sum(night.outcome == "hold" for night in s.nights)
        lines.append(f"| {s.plan.base} | {s.plan.model} | {s.plan.faults} | {held} | {spans} | {max(counts[24:])} |")
    return "\n".join(lines)


def _event_lines(series: Sequence[SeriesSeen]) -> list[str]:
    lines = []
    for s in series:
        if not s.plan.events:
            continue
        lines += [f"\n{s.plan.name}\n", "| night | event | k | octaves | material | told as | delay |"]
        lines.append("|---|---|---|---|---|---|---|")
        for e in (*s.events, *s.drips):
            said = ", ".join(e.kinds) or "-"
            since = f" (from {e.material_from})" if e.material_from >= 0 else ""
            material = ("yes" if e.material else "no") + since
            delay = e.delay if e.delay >= 0 else "-"
            lines.append(f"| {e.night} | {e.event} | {e.count} | {e.octaves:.2f} | {material} | {said} | {delay} |")
    return lines
