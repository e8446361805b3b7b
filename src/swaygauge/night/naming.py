"""Names around a night: when one was first seen, which one to print, which other ones a node is known by."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from datetime import date
from typing import Any, Final

import numpy as np

from swaygauge.moves import entered_left_top
from swaygauge.night.work import Work
from swaygauge.readers.aliases import Resolved, resolve
from swaygauge.records import Alert, Ids, Moves
from swaygauge.scores import SCORES
from swaygauge.scores.leaks import LeakReport
from swaygauge.store.rows import AliasRow

NAMED_AT_MOST: Final = 10


def first_seen(work: Work) -> Callable[[str], date | None]:
    """When a name was first in any snapshot of the network."""
    table = work.store.names(work.network)

    def look(name: str) -> date | None:
        ids = table.lookup([name])
        return date.fromordinal(int(table.first_seen(ids)[0])) if ids[0] >= 0 else None

    return look


def resolved(work: Work, night: date) -> Resolved:
    """What the alias table means on that night."""
    return resolve(work.aliases(), night, first_seen=first_seen(work))


def nodes_named(alerts: Sequence[Alert]) -> set[int]:
    """Every node that an alert or its facts speak of."""
    named = {alert.node for alert in alerts if alert.node >= 0}
    for alert in alerts:
        named.update(int(node) for node in alert.facts.get("nodes", ()))
        if isinstance(alert.facts.get("old"), int):
            named.add(alert.facts["old"])
    return named


def shown_names(work: Work, night: date, nodes: set[int]) -> dict[int, str]:
    """The name to print for each node on that night: the newest alias, else the name it was first seen under."""
    table = work.store.names(work.network)
    ordered = sorted(nodes)
    texts = dict(zip(ordered, table.texts(ordered), strict=True))
    shown = resolved(work, night).shown
    return {node: shown.get(text, text) for node, text in texts.items()}


def name_the_top(work: Work, night: date) -> dict[str, Any]:
    """Who entered and who left the top of each score, and which endorsed nodes eigenvector centrality zeroes.

    Of each list the first NAMED_AT_MOST names, best place (most endorsed) first, and the number of all.
    """
    store, network = work.store, work.network
    depth = work.settings.scores.top
    lists: dict[str, Ids] = {"zeroed": store.record(LeakReport, network, night, kind="leaks", staged=True).ids}
    for score in SCORES:
        if store.has_part(network, night, kind="moves", score=score, staged=True):
            moves = store.record(Moves, network, night, kind="moves", score=score, staged=True)
            entered, left = entered_left_top(moves, depth)
            for word, ids, rank in (("entered", entered, moves.rank_now), ("left", left, moves.rank_before)):
                places = rank[np.searchsorted(moves.ids, ids)]
                lists[f"{word}.{score}"] = ids[np.lexsort((ids, places))]
    told = {key: ids[:NAMED_AT_MOST].tolist() for key, ids in lists.items()}
    names = shown_names(work, night, {node for nodes in told.values() for node in nodes})
    return {key: {"count": len(lists[key]), "names": [names[node] for node in nodes]} for key, nodes in told.items()}


def alias_rows(work: Work, night: date) -> list[AliasRow]:
    """Every other name that a node of the store is known by, from the alias table, as far as valid on that night."""
    table = work.store.names(work.network)
    names = resolved(work, night)
    valid = {alias.new: alias.valid_from for alias in work.aliases() if alias.valid_from <= night}
    valid |= {alias.old: alias.valid_from for alias in work.aliases() if alias.valid_from <= night}
    rows = []
    for name, canonical in names.canonical.items():
        node = int(table.lookup([canonical])[0])
        if node >= 0:
            shown = names.shown.get(canonical) == name
            rows.append(AliasRow(work.network, name, node, valid.get(name, night), shown))
    return rows
