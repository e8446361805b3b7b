"""The stages of one night. Each loads from the store, calls pure functions, and saves to the store.

A stage reads what the stages before it staged for this night, and what was published for the nights before. Nothing
becomes visible until ``publish`` moves all of it into place in one transaction.
"""

from __future__ import annotations

from collections.abc import Callable
from datetime import date

import numpy as np

from swaygauge.checks.profile import measure
from swaygauge.checks.verdict import judge
from swaygauge.effective import advance, comparable_before, start_book
from swaygauge.errors import InputError
from swaygauge.night.compare import compare
from swaygauge.night.history import history_of
from swaygauge.night.naming import resolved
from swaygauge.night.publish import publish
from swaygauge.night.result import StageResult
from swaygauge.night.scoring import score
from swaygauge.night.steps import known_now, settled
from swaygauge.night.work import Work
from swaygauge.readers import read_links
from swaygauge.readers.aliases import apply_aliases
from swaygauge.readers.lists import read_names
from swaygauge.readers.snapshot import make_snapshot
from swaygauge.records import Ids, Snapshot, Verdict


def _fetched_ids(work: Work, night: date, canonical: dict[str, str]) -> Ids | None:
    file = work.fetch_list(night)
    if file is None:
        return None
    names = read_names(file, normalise=work.settings.reader.normalise_hosts).names
    ids = work.store.names(work.network).lookup([canonical.get(name, name) for name in names])
    # a source that was fetched and was never in any snapshot has no id, and nothing that could be carried
    return np.unique(ids[ids >= 0]).astype(np.int32)


def ingest(work: Work, night: date) -> StageResult:
    """File -> raw snapshot with persistent ids."""
    path = work.found().nights.get(night)
    if path is None:
        raise InputError(
            f"no snapshot for {night} in {work.folder.name}/: expected a file named like "
            f"{work.settings.snapshots.pattern!r}. Put the file there, or name another night."
        )
    aliases = resolved(work, night)
    raw = apply_aliases(read_links(path, work.settings.reader), aliases)
    ids = work.store.names(work.network).intern(raw.names, night=night)
    fetched = _fetched_ids(work, night, aliases.canonical)
    snapshot = make_snapshot(night, raw, ids=ids, self_links=work.settings.reader.self_links, fetched=fetched)
    work.store.stage_record(work.network, night, kind="raw", record=snapshot)
    return StageResult(snapshot.origin.rows, f"{len(snapshot.source)} links from {snapshot.origin.file}")


def check(work: Work, night: date) -> StageResult:
    """Raw snapshot -> profile -> verdict."""
    history = history_of(work, night)
    snapshot = work.store.record(Snapshot, work.network, night, kind="raw", staged=True)
    book, known = history.book(), history.known()
    profile = measure(snapshot, book, trailing=history.baseline_profiles, known_nodes=known["id"] if known else None)
    verdict = judge(profile, work.settings.checks, fine_nights=history.fine_profiles)
    if verdict.outcome == "hold":
        by_hand = night in work.accepted_by_hand()
        held = history.held_snapshots()
        verdict = settled(verdict, snapshot, held, limits=work.settings.checks, by_hand=by_hand)
    work.store.stage_record(work.network, night, kind="profile", record=profile)
    work.store.stage_record(work.network, night, kind="verdict", record=verdict)
    return StageResult(len(verdict.results), verdict.outcome + "".join(f"; {reason}" for reason in verdict.reasons))


def prepare(work: Work, night: date) -> StageResult:
    """Raw snapshot + last effective one -> what is scored: links carried, waiting, gone."""
    store, network = work.store, work.network
    verdict = store.record(Verdict, network, night, kind="verdict", staged=True)
    if verdict.outcome == "hold":
        return StageResult(0, "held: nothing is scored")
    snapshot = store.record(Snapshot, network, night, kind="raw", staged=True)
    history = history_of(work, night)
    before = history.book()
    if before is None:
        book = start_book(snapshot)
        detail = "first night"
    else:
        book, changes, upkeep = advance(before, snapshot, verdict, options=work.settings.upkeep)
        store.stage_record(network, night, kind="changes", record=changes)
        store.stage_record(network, night, kind="upkeep", record=upkeep)
        adjusted = comparable_before(before, changes)
        if adjusted is not None:
            store.stage_record(network, night, kind="adjusted", record=adjusted)
        detail = f"{upkeep.carried_links} carried, {upkeep.waiting_links} waiting"
    store.stage_record(network, night, kind="book", record=book)
    store.stage_part(network, night, kind="known", columns=known_now(night, history.known(), book))
    return StageResult(int(book.in_effect.sum()), detail)


STAGES: dict[str, Callable[[Work, date], StageResult]] = {
    "ingest": ingest,
    "check": check,
    "prepare": prepare,
    "score": score,
    "compare": compare,
    "publish": publish,
}


def run_stage(work: Work, night: date, stage: str) -> StageResult:
    """One named stage of one night."""
    return STAGES[stage](work, night)
