"""The last stage: everything staged for a night becomes visible at once, and is described in words."""

from __future__ import annotations

from datetime import date

from swaygauge.episodes import describe
from swaygauge.night.compare import staged_alerts
from swaygauge.night.history import History, history_of
from swaygauge.night.naming import alias_rows, name_the_top, nodes_named, shown_names
from swaygauge.night.result import StageResult
from swaygauge.night.work import Work, basis_of, side_digest_of
from swaygauge.records import Pin, Snapshot, SpectralBounds, Verdict
from swaygauge.store.rows import CHAINED, NightRow
from swaygauge.visible import visible


def _row(work: Work, night: date, history: History) -> NightRow:
    store, network = work.store, work.network
    snapshot = store.record(Snapshot, network, night, kind="raw", staged=True)
    verdict = store.record(Verdict, network, night, kind="verdict", staged=True)
    held = verdict.outcome == "hold"
    pin = None if held else store.record(Pin, network, night, kind="pin", staged=True)
    bounds = None if held else store.record(SpectralBounds, network, night, kind="bounds", staged=True)
    stored = store.night_row(network, night)
    path = work.found().nights[night]
    by_hand = work.accepted_by_hand().get(night, "")
    return NightRow(
        network,
        night,
        state="held" if held else "published",
        outcome=verdict.outcome,
        degraded=verdict.outcome == "repair",
        coverage_step=verdict.coverage_step,
        previous=history.previous.night if history.previous else None,
        gap_nights=history.gap_nights,
        era=pin.night if pin else None,
        alpha=pin.alpha if pin else None,
        lambda_lower=bounds.lower if bounds else None,
        lambda_upper=bounds.upper if bounds else None,
        input_file=path.name,
        input_sha256=snapshot.origin.sha256,
        input_size=snapshot.origin.size,
        input_mtime_ns=path.stat().st_mtime_ns,
        aliases_digest=side_digest_of(work, night, work.aliases()),
        settings_digest=work.settings.digest(),
        basis=basis_of(work, night),
        accepted=not held,
        reason=by_hand or "; ".join(verdict.reasons),
        version=stored.version if stored else 0,
    )


def publish(work: Work, night: date) -> StageResult:
    """Staged -> visible, in one transaction."""
    history = history_of(work, night)
    alerts = staged_alerts(work, night)
    names = shown_names(work, night, nodes_named(alerts))
    printable = {node: visible(name) for node, name in names.items()}
    verdict = work.store.record(Verdict, work.network, night, kind="verdict", staged=True)
    if verdict.outcome != "hold":
        work.store.stage_fact(work.network, night, name="named", value=name_the_top(work, night))
    row = work.store.publish(
        _row(work, night, history),
        checks=verdict.results,
        alerts=alerts,
        node_names=names,
        sentences={alert.key: describe(alert, printable.__getitem__) for alert in alerts},
        aliases=alias_rows(work, night),
    )
    if row.state == "held":
        return StageResult(0, f"held: {row.reason}")
    return StageResult(len(alerts), f"{row.outcome}, {len(alerts)} alerts")


def refuse(work: Work, night: date, reason: str) -> None:
    """Note that a night's file could not be used. A night that is already stored stays as it is."""
    stored = work.store.night_row(work.network, night)
    work.store.clear_staging(work.network, night)
    if stored is not None and stored.state in CHAINED:
        return
    path = work.found().nights.get(night)
    stat = path.stat() if path else None
    row = NightRow(
        work.network,
        night,
        state="refused",
        input_file=path.name if path else "",
        input_size=stat.st_size if stat else 0,
        input_mtime_ns=stat.st_mtime_ns if stat else 0,
        settings_digest=work.settings.digest(),
        reason=reason,
        version=stored.version if stored else 0,
    )
    work.store.publish(row)
