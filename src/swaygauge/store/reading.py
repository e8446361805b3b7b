"""The Reader: the store as terminal and page ask it. It writes nothing and a run beside it does not disturb it.

On a SQLite workspace it loads neither SQLAlchemy, NumPy, pandas nor pyarrow; DuckDB only when a series is asked for.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence
from datetime import date
from pathlib import Path
from types import TracebackType
from typing import Any, Final, Self, TypeVar

from swaygauge.errors import Damaged, NotInStore, StoreError
from swaygauge.store import queries, series
from swaygauge.store.asking import open_read_only
from swaygauge.store.layout import MOVES, SCORES
from swaygauge.store.rows import AcceptanceRow, AlertRow, NightRow, RunRow
from swaygauge.store.views import MoveRow, NightView, NodeMatch, StandingRow, TracePoint

ALL: Final = 2**31 - 1
Answer = TypeVar("Answer")


class Reader:
    """Questions to one workspace. Names come back exactly as they are stored; print them through ``visible``."""

    def __init__(self, workspace: Path, ask: queries.Ask, close: Callable[[], None]) -> None:
        self._ask = ask
        self._close = close
        self._series = series.Series(workspace)

    @classmethod
    def open(cls, workspace: Path, *, url: str | None = None) -> Reader:
        """Open a workspace read-only. Raises NotInStore when there is none, StoreError when its schema is another."""
        workspace = workspace.absolute()
        ask, close = open_read_only(workspace, url)
        return cls(workspace, ask, close)

    def close(self) -> None:
        """Let go of the catalog."""
        self._series.close()
        self._close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    # ---- small facts

    def networks(self) -> tuple[str, ...]:
        """Names of all networks, sorted."""
        return queries.networks(self._ask)

    def nights(self, network: str) -> tuple[NightRow, ...]:
        """All nights, of every state, in date order."""
        return queries.nights(self._ask, network)

    def latest(self, network: str, *, state: str | None = None) -> NightRow | None:
        """The newest night, of one state if given; None when there is none."""
        found = [row for row in self.nights(network) if state is None or row.state == state]
        return found[-1] if found else None

    def night(self, network: str, night: date) -> NightView:
        """One night with its facts, checks and alerts. Raises NotInStore."""
        while True:
            view = NightView(
                row=self._night_row(network, night),
                facts=queries.facts(self._ask, network, night),
                checks=queries.checks(self._ask, network, night),
                alerts=queries.alerts(self._ask, network, first=night, last=night),
            )
            if self._night_row(network, night) == view.row:  # else it was published meanwhile: never half of each
                return view

    def facts(self, network: str, *, name: str, nights: Sequence[date]) -> dict[date, Any]:
        """One fact over nights, in date order; nights without it are left out."""
        return queries.fact_over_nights(self._ask, network, name, nights)

    def alerts(
        self, network: str, *, first: date, last: date | None = None, kind: str = "", node: int | None = None
    ) -> tuple[AlertRow, ...]:
        """Alerts of one night, or of the nights first to last, in their order; of one kind or node if given."""
        return queries.alerts(self._ask, network, first=first, last=last or first, kind=kind, node=node)

    def runs(self, network: str, *, count: int = 20) -> tuple[RunRow, ...]:
        """The newest runs, newest first."""
        return queries.runs(self._ask, network, count)

    def acceptances(self, network: str) -> tuple[AcceptanceRow, ...]:
        """Every acceptance in the order it was made."""
        return queries.acceptances(self._ask, network)

    # ---- series

    def standing(
        self, network: str, night: date, *, score: str, first: int = 1, count: int = 20, search: str = ""
    ) -> tuple[StandingRow, ...]:
        """``count`` rows of a night's ranking from the ``first`` row on; with ``search``, of nodes whose name holds it.

        Rows are ordered by rank, then id. Raises NotInStore when the night has no such score.
        """
        return self._steady(lambda: self._standing(network, night, score, first, count, search))

    def moves(
        self, network: str, night: date, *, score: str, count: int = 20, direction: str = "", within: int = 0
    ) -> tuple[MoveRow, ...]:
        """The largest moves of a night, by octaves; arrivals and departures ("came", "left") by rank.

        direction: "rose", "fell", "came", "left", or "" for both rises and falls. within: only nodes whose better rank
        of the two nights is at most this; 0 = all. Raises NotInStore when no comparison was made.
        """
        if direction not in series.MOVES:
            raise StoreError(f"direction: expected one of {sorted(series.MOVES)}, got {direction!r}")
        return self._steady(lambda: self._moves(network, night, score, count, direction, within))

    def trace(self, network: str, node: int, *, score: str, nights: int | None = None) -> tuple[TracePoint, ...]:
        """One node over the newest ``nights`` stored nights (None: all); one point per night, also without it."""
        return self._steady(lambda: self._trace(network, node, score, nights))

    def names(self, network: str, ids: Collection[int]) -> dict[int, str]:
        """The name to show for each id. Raises Damaged when the name table does not hold them all."""
        return {node: name for node, (name, _) in self._steady(lambda: self._shown(network, ids)).items()}

    def find_node(self, network: str, text: str, *, count: int = 10) -> tuple[NodeMatch, ...]:
        """The nodes of exactly this name or alias; failing that, names that hold it; failing that, names like it."""
        return self._steady(lambda: self._find_node(network, text, count))

    # ---- how

    def _standing(
        self, network: str, night: date, score: str, first: int, count: int, search: str
    ) -> tuple[StandingRow, ...]:
        scores, compared = self._parts(network, night, score)
        page = {"count": count, "skip": max(first, 1) - 1}
        if search:
            among = self._ids_holding(network, search, ALL)
            found = self._series.rows(series.STANDING_AMONG, scores, ids=among, **page)
        else:
            found = self._series.rows(series.STANDING, scores, **page)
        ids = [row[3] for row in found]
        shown = self._shown(network, ids)
        before = {node: rest for node, *rest in self._series.rows(series.MOVES_OF, compared, ids=ids)}
        return tuple(
            StandingRow(rank, best, worst, node, shown[node][0], value, bound, *before.get(node, (None, None)))
            for rank, best, worst, node, value, bound in found
        )

    def _moves(
        self, network: str, night: date, score: str, count: int, direction: str, within: int
    ) -> tuple[MoveRow, ...]:
        _, compared = self._parts(network, night, score)
        if not compared:
            raise NotInStore(
                f"{network}, night {night}: {score} was not compared with another night (the first has none)."
            )
        found = self._series.rows(series.MOVES[direction], compared, count=count, within=within or ALL)
        shown = self._shown(network, [row[0] for row in found])
        return tuple(_move(row, shown[row[0]][0]) for row in found)

    def _trace(self, network: str, node: int, score: str, nights: int | None) -> tuple[TracePoint, ...]:
        rows = self.nights(network)
        rows = rows[max(len(rows) - nights, 0) :] if nights is not None else rows
        wanted = {row.night for row in rows}
        parts = queries.parts_of_kind(self._ask, network, SCORES, score)
        found = self._series.trace({part.night: part.path for part in parts if part.night in wanted}, node)
        absent = (None,) * 5
        return tuple(TracePoint(row.night, row.state, row.degraded, *found.get(row.night, absent)) for row in rows)

    def _find_node(self, network: str, text: str, count: int) -> tuple[NodeMatch, ...]:
        text = text.encode("utf-8", "replace").decode()  # what a terminal passed on need not be UTF-8
        paths = self._name_paths(network)
        how = {alias.node: "alias" for alias in queries.aliases(self._ask, network, name=text)}
        how |= {node: "name" for (node,) in self._series.rows(series.ID_OF_NAME, paths, text=text)}
        if not how:
            how = dict.fromkeys(self._ids_holding(network, text, count), "close")
        if not how:
            alike = self._series.rows(series.IDS_ALIKE, paths, text=text, count=count)
            how = {node: "close" for (node,) in alike}
        shown = self._shown(network, how)
        return tuple(NodeMatch(node, *shown[node], kind) for node, kind in how.items())

    def _ids_holding(self, network: str, text: str, count: int) -> list[int]:
        """Nodes one of whose names holds the text, upper and lower case alike; shortest names first."""
        text = text.encode("utf-8", "replace").decode()
        by_name = self._series.rows(series.IDS_HOLDING, self._name_paths(network), text=text, count=count)
        by_alias = [a.node for a in queries.aliases(self._ask, network) if text.lower() in a.name.lower()]
        return list(dict.fromkeys([*by_alias, *(row[0] for row in by_name)]))[:count]

    def _shown(self, network: str, ids: Collection[int]) -> dict[int, tuple[str, date]]:
        """Id -> the name to show and the night it was first seen. Raises Damaged unless all are there."""
        names = self._series.names(self._name_paths(network), ids)
        if len(names) < len(set(ids)):
            lacking = sorted(set(ids) - set(names))[:5]
            raise Damaged(f"{network}: the name table has no name for ids {lacking}. Run `checkup` to see what to do.")
        instead = queries.shown_aliases(self._ask, network) if names else {}
        return {node: (instead.get(node, name), seen) for node, (name, seen) in names.items()}

    def _name_paths(self, network: str) -> list[str]:
        return [part.path for part in queries.name_parts(self._ask, network)]

    def _parts(self, network: str, night: date, score: str) -> tuple[list[str], list[str]]:
        """Where the night's scores are and, if it was compared, its moves; both as of one moment."""
        parts = queries.parts(self._ask, network, night)
        scores = [part.path for part in parts if (part.kind, part.score) == (SCORES, score)]
        if not scores:
            state = self._night_row(network, night).state
            there = sorted(part.score for part in parts if part.kind == SCORES)
            raise NotInStore(
                f"{network}, night {night} ({state}): there is no score {score[:80]!r}; "
                + (f"there is {', '.join(there)}." if there else "a night is scored when it is published.")
            )
        return scores, [part.path for part in parts if (part.kind, part.score) == (MOVES, score)]

    def _night_row(self, network: str, night: date) -> NightRow:
        row = queries.night(self._ask, network, night)
        if row is None:
            known = self.nights(network)
            there = f"It has {known[0].night} to {known[-1].night}" if known else "It has no night yet"
            raise NotInStore(f"{network}: night {night} is not in the store. {there}.")
        return row

    def _steady(self, answer: Callable[[], Answer]) -> Answer:
        """Ask again once when a file has gone: a run may have replaced it since the catalog was read."""
        try:
            return answer()
        except Damaged:
            return answer()


def _move(row: tuple[Any, ...], name: str) -> MoveRow:
    node, status, rank_before, rank_now, value_before, value_now, octaves, deviation = row
    if status == series.MOVED:
        direction = "rose" if octaves > 0 else "fell" if octaves < 0 else ""
        return MoveRow(node, name, direction, rank_before, rank_now, value_before, value_now, octaves, deviation)
    if status == series.ARRIVED:
        return MoveRow(node, name, "came", None, rank_now, None, value_now, None, None)
    return MoveRow(node, name, "left", rank_before, None, value_before, None, None, None)
