"""What is asked of the catalog, as SQL that SQLite and PostgreSQL both answer; the writer and the reader share it.

Each function takes ``ask``, which runs one SELECT with ``:name`` values and returns plain tuples.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from datetime import date
from typing import Any, Protocol, TypeVar

from swaygauge.store.rows import (
    AcceptanceRow,
    AlertRow,
    AliasRow,
    CheckRow,
    FactRow,
    NamePartRow,
    NightRow,
    PartRow,
    RunRow,
    canonical_json,
    columns,
    from_database,
)

Row = TypeVar("Row")


class Ask(Protocol):
    """Runs one SELECT; values fill its ``:name`` places."""

    def __call__(self, sql: str, /, **values: Any) -> list[tuple[Any, ...]]: ...


def _select(ask: Ask, cls: type[Row], table: str, where: str, **values: Any) -> tuple[Row, ...]:
    """Rows of one table. table and where are words of this module, never of a caller."""
    sql = " ".join(("SELECT", ", ".join(columns(cls)), "FROM", table, "WHERE", where))
    return tuple(from_database(cls, found) for found in ask(sql, **values))


def schema_number(ask: Ask) -> int:
    """How many migrations the catalog has had."""
    return int(ask("SELECT coalesce(max(number), 0) FROM migration")[0][0])


def networks(ask: Ask) -> tuple[str, ...]:
    """Names of all networks, sorted."""
    return tuple(sorted(name for (name,) in ask("SELECT name FROM network")))


def nights(ask: Ask, network: str) -> tuple[NightRow, ...]:
    """All nights of every state in date order."""
    return _select(ask, NightRow, "night", "network = :network ORDER BY night", network=network)


def night(ask: Ask, network: str, when: date) -> NightRow | None:
    """One night, if the catalog has it."""
    found = _select(ask, NightRow, "night", "network = :network AND night = :night", network=network, night=str(when))
    return found[0] if found else None


def accepted_nights(ask: Ask, network: str, *, before: date, last: int | None) -> tuple[NightRow, ...]:
    """The newest ``last`` accepted nights (all when None) before a date, in date order."""
    newest_first = _select(
        ask,
        NightRow,
        "night",
        "network = :network AND night < :before AND accepted = 1 ORDER BY night DESC LIMIT :last",
        network=network,
        before=str(before),
        last=2**31 - 1 if last is None else last,
    )
    return newest_first[::-1]


def parts(ask: Ask, network: str, when: date, *, staged: bool = False) -> tuple[PartRow, ...]:
    """The parts of one night."""
    where = "network = :network AND night = :night ORDER BY kind, score"
    return _select(ask, PartRow, "staged_part" if staged else "part", where, network=network, night=str(when))


def part(ask: Ask, network: str, when: date, kind: str, score: str, *, staged: bool = False) -> PartRow | None:
    """One part of one night, if there is one."""
    where = "network = :network AND night = :night AND kind = :kind AND score = :score"
    table = "staged_part" if staged else "part"
    found = _select(ask, PartRow, table, where, network=network, night=str(when), kind=kind, score=score)
    return found[0] if found else None


def parts_of_kind(ask: Ask, network: str, kind: str, score: str) -> tuple[PartRow, ...]:
    """One kind of part over all nights in date order."""
    where = "network = :network AND kind = :kind AND score = :score ORDER BY night"
    return _select(ask, PartRow, "part", where, network=network, kind=kind, score=score)


def all_parts(ask: Ask, network: str, *, staged: bool = False) -> tuple[PartRow, ...]:
    """Every part of a network."""
    where = "network = :network ORDER BY night, kind, score"
    return _select(ask, PartRow, "staged_part" if staged else "part", where, network=network)


def facts(ask: Ask, network: str, when: date, *, staged: bool = False) -> dict[str, Any]:
    """All facts of one night."""
    where = "network = :network AND night = :night ORDER BY name"
    found = _select(ask, FactRow, "staged_fact" if staged else "fact", where, network=network, night=str(when))
    return {fact.name: fact.value for fact in found}


def fact_over_nights(ask: Ask, network: str, name: str, wanted: Sequence[date]) -> dict[date, Any]:
    """One fact on the wanted nights, in date order; nights that lack it are left out."""
    if not wanted:
        return {}
    found = _select(
        ask,
        FactRow,
        "fact",
        "network = :network AND name = :name AND night BETWEEN :first AND :last ORDER BY night",
        network=network,
        name=name,
        first=str(min(wanted)),
        last=str(max(wanted)),
    )
    among = set(wanted)
    return {fact.night: fact.value for fact in found if fact.night in among}


def staged_nights(ask: Ask, network: str) -> tuple[date, ...]:
    """Nights that were begun and not published."""
    sql = (
        "SELECT night FROM staged_part WHERE network = :network "
        "UNION SELECT night FROM staged_fact WHERE network = :network"
    )
    return tuple(sorted(date.fromisoformat(found) for (found,) in ask(sql, network=network)))


def checks(ask: Ask, network: str, when: date) -> tuple[CheckRow, ...]:
    """The checks of one night in their order."""
    where = "network = :network AND night = :night ORDER BY position"
    return _select(ask, CheckRow, "check_result", where, network=network, night=str(when))


def alerts(
    ask: Ask, network: str, *, first: date, last: date, kind: str = "", node: int | None = None
) -> tuple[AlertRow, ...]:
    """Alerts of a range of nights, of one kind or one node if given, by night and then in their order."""
    where = "network = :network AND night BETWEEN :first AND :last"
    values: dict[str, Any] = {"network": network, "first": str(first), "last": str(last)}
    if kind:
        where, values["kind"] = where + " AND kind = :kind", kind
    if node is not None:
        where, values["node"] = where + " AND node = :node", node
    return _select(ask, AlertRow, "alert", where + " ORDER BY night, position", **values)


def acceptances(ask: Ask, network: str) -> tuple[AcceptanceRow, ...]:
    """Every acceptance in the order it was made."""
    return _select(ask, AcceptanceRow, "acceptance", "network = :network ORDER BY number", network=network)


def runs(ask: Ask, network: str, count: int) -> tuple[RunRow, ...]:
    """The newest runs, newest first."""
    where = "network = :network ORDER BY started DESC, run_id LIMIT :count"
    return _select(ask, RunRow, "run", where, network=network, count=count)


def name_parts(ask: Ask, network: str) -> tuple[NamePartRow, ...]:
    """The parts of the name table in id order."""
    return _select(ask, NamePartRow, "name_part", "network = :network ORDER BY first", network=network)


def aliases(ask: Ask, network: str, *, name: str | None = None) -> tuple[AliasRow, ...]:
    """Other names of nodes; of one exact text if given."""
    if name is None:
        return _select(ask, AliasRow, "alias", "network = :network ORDER BY node, name", network=network)
    where = "network = :network AND name = :name"
    return _select(ask, AliasRow, "alias", where, network=network, name=canonical_json(name))


def shown_aliases(ask: Ask, network: str) -> dict[int, str]:
    """Node -> the name to show instead of the one it was first seen under."""
    sql = "SELECT node, name FROM alias WHERE network = :network AND shown = 1 ORDER BY valid_from, name"
    return {node: json.loads(name) for node, name in ask(sql, network=network)}
