"""Series over stored parts, asked in SQL: DuckDB reads the Parquet files that the catalog names, and nothing else.

DuckDB is loaded at the first question and keeps no file of its own.
"""

from __future__ import annotations

from collections.abc import Collection, Sequence
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from swaygauge.errors import Damaged

if TYPE_CHECKING:
    import duckdb

# the codes of ``records``, which cannot be imported here: it needs NumPy
MOVED: Final = 0
ARRIVED: Final = 1
DEPARTED: Final = 2

STANDING: Final = """
    SELECT rank, best, worst, id, value, bound
    FROM read_parquet($files, hive_partitioning = false)
    ORDER BY rank, id LIMIT $count OFFSET $skip"""

STANDING_AMONG: Final = """
    SELECT rank, best, worst, id, value, bound
    FROM read_parquet($files, hive_partitioning = false)
    WHERE id IN (SELECT unnest($ids::INTEGER[]))
    ORDER BY rank, id LIMIT $count OFFSET $skip"""

MOVES_OF: Final = """
    SELECT id, rank_before, octaves
    FROM read_parquet($files, hive_partitioning = false)
    WHERE id IN (SELECT unnest($ids::INTEGER[])) AND rank_before > 0"""

_MOVES: Final = """
    SELECT id, status, rank_before, rank_now, value_before, value_now, octaves, deviation
    FROM read_parquet($files, hive_partitioning = false)
    WHERE (CASE WHEN rank_before = 0 THEN rank_now WHEN rank_now = 0 THEN rank_before
           ELSE least(rank_before, rank_now) END) <= $within
    AND """

MOVES: Final = {
    "": _MOVES + "status = 0 AND octaves <> 0 ORDER BY abs(octaves) DESC, id LIMIT $count",
    "rose": _MOVES + "status = 0 AND octaves > 0 ORDER BY octaves DESC, id LIMIT $count",
    "fell": _MOVES + "status = 0 AND octaves < 0 ORDER BY octaves, id LIMIT $count",
    "came": _MOVES + "status = 1 ORDER BY rank_now, id LIMIT $count",
    "left": _MOVES + "status = 2 ORDER BY rank_before, id LIMIT $count",
}

TRACE: Final = """
    SELECT filename, rank, best, worst, value, bound
    FROM read_parquet($files, hive_partitioning = false, filename = true)
    WHERE id = $node"""

NAMES_OF: Final = """
    SELECT id, name, first_seen
    FROM read_parquet($files, hive_partitioning = false)
    WHERE id IN (SELECT unnest($ids::INTEGER[]))"""

ID_OF_NAME: Final = "SELECT id FROM read_parquet($files, hive_partitioning = false) WHERE name = $text"

IDS_HOLDING: Final = """
    SELECT id FROM read_parquet($files, hive_partitioning = false)
    WHERE contains(lower(name), lower($text)) ORDER BY length(name), id LIMIT $count"""

# names alike in spelling (Jaro 1989, Winkler 1990); below .8 the likeness is mostly chance on short names
IDS_ALIKE: Final = """
    SELECT id FROM read_parquet($files, hive_partitioning = false)
    WHERE abs(length(name) - length($text)) <= 3 AND jaro_winkler_similarity(lower(name), lower($text)) >= 0.8
    ORDER BY jaro_winkler_similarity(lower(name), lower($text)) DESC, id LIMIT $count"""


class Series:
    """Questions to the Parquet files of one workspace."""

    def __init__(self, workspace: Path) -> None:
        self._workspace = workspace
        self._database: duckdb.DuckDBPyConnection | None = None

    def close(self) -> None:
        """End the in-memory database, if it was begun."""
        if self._database is not None:
            self._database.close()

    def rows(self, sql: str, paths: Collection[str], **values: Any) -> list[tuple[Any, ...]]:
        """Rows over the parts at ``paths`` (relative to the workspace); no parts, no rows.

        Raises Damaged when a file is missing or is not readable Parquet.
        """
        if not paths:
            return []
        import duckdb

        if self._database is None:
            self._database = duckdb.connect(":memory:", config={"autoinstall_known_extensions": "false"})
        try:
            files = [_literal(str(self._workspace / path)) for path in paths]
            return self._database.execute(sql, {"files": files, **values}).fetchall()
        except duckdb.Error as error:
            first_line = str(error).splitlines()[0]
            raise Damaged(
                f"a stored part cannot be read: {first_line}. Run `checkup` to see which and what to do."
            ) from None

    def trace(self, paths: dict[date, str], node: int) -> dict[date, tuple[Any, ...]]:
        """Night -> rank, best, worst, value, bound of one node, over one scores part per night."""
        night_of = {str(self._workspace / path): night for night, path in paths.items()}
        found = self.rows(TRACE, list(paths.values()), node=node)
        return {night_of[file]: tuple(rest) for file, *rest in found}

    def names(self, paths: Sequence[str], ids: Collection[int]) -> dict[int, tuple[str, date]]:
        """Id -> the name it was first seen under, and when."""
        if not ids:
            return {}
        return {node: (name, seen) for node, name, seen in self.rows(NAMES_OF, paths, ids=sorted(set(ids)))}


def _literal(path: str) -> str:
    """A path as a pattern that matches just itself: DuckDB takes * ? [ in a file name for wildcards."""
    return "".join(f"[{char}]" if char in "*?[" else char for char in path)
