"""The catalog's schema as an ordered list of recorded steps. A released step is never edited; a change is a new step.

Plain SQL that SQLite and PostgreSQL both take. The table ``migration`` of a catalog tells which steps it has had.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from swaygauge.errors import StoreError


@dataclass(frozen=True)
class Migration:
    """One step. ``number`` counts from 1 without gaps."""

    number: int
    name: str
    statements: tuple[str, ...]


_PART: Final = """
    CREATE TABLE {table} (
        network TEXT NOT NULL, night TEXT NOT NULL, kind TEXT NOT NULL, score TEXT NOT NULL,
        path TEXT NOT NULL, sha256 TEXT NOT NULL, bytes BIGINT NOT NULL, rows BIGINT NOT NULL,
        PRIMARY KEY (network, night, kind, score))"""

_FACT: Final = """
    CREATE TABLE {table} (
        network TEXT NOT NULL, night TEXT NOT NULL, name TEXT NOT NULL, value TEXT NOT NULL,
        PRIMARY KEY (network, night, name))"""

MIGRATIONS: Final = (
    Migration(
        1,
        "networks, nights, parts, facts, checks, alerts, runs, acceptances, names",
        (
            "CREATE TABLE network (name TEXT PRIMARY KEY, created TEXT NOT NULL)",
            """
            CREATE TABLE night (
                network TEXT NOT NULL REFERENCES network (name), night TEXT NOT NULL,
                state TEXT NOT NULL CHECK (state IN ('published', 'held', 'refused', 'missing')),
                outcome TEXT NOT NULL, degraded INTEGER NOT NULL, coverage_step INTEGER NOT NULL,
                previous TEXT, gap_nights INTEGER NOT NULL,
                era TEXT, alpha DOUBLE PRECISION, lambda_lower DOUBLE PRECISION, lambda_upper DOUBLE PRECISION,
                input_file TEXT NOT NULL, input_sha256 TEXT NOT NULL, input_size BIGINT NOT NULL,
                input_mtime_ns BIGINT NOT NULL, aliases_digest TEXT NOT NULL, settings_digest TEXT NOT NULL,
                basis TEXT NOT NULL, accepted INTEGER NOT NULL, reason TEXT NOT NULL, digest TEXT NOT NULL,
                version INTEGER NOT NULL,
                PRIMARY KEY (network, night))""",
            _PART.format(table="part"),
            _PART.format(table="staged_part"),
            _FACT.format(table="fact"),
            _FACT.format(table="staged_fact"),
            """
            CREATE TABLE check_result (
                network TEXT NOT NULL, night TEXT NOT NULL, position INTEGER NOT NULL,
                rule TEXT NOT NULL, column_name TEXT NOT NULL, value DOUBLE PRECISION, expected TEXT NOT NULL,
                severity TEXT NOT NULL, ok INTEGER NOT NULL, crashed TEXT NOT NULL,
                PRIMARY KEY (network, night, position))""",
            """
            CREATE TABLE alert (
                network TEXT NOT NULL, night TEXT NOT NULL, position INTEGER NOT NULL,
                key TEXT NOT NULL, kind TEXT NOT NULL, node BIGINT NOT NULL, node_name TEXT NOT NULL,
                score TEXT NOT NULL, direction TEXT NOT NULL, rank_before BIGINT NOT NULL, rank_now BIGINT NOT NULL,
                size DOUBLE PRECISION NOT NULL, facts TEXT NOT NULL, sentence TEXT NOT NULL,
                PRIMARY KEY (network, night, position), UNIQUE (network, key))""",
            "CREATE INDEX alert_by_node ON alert (network, node)",
            """
            CREATE TABLE run (
                run_id TEXT PRIMARY KEY, network TEXT NOT NULL, night TEXT NOT NULL, outcome TEXT NOT NULL,
                started TEXT NOT NULL, finished TEXT NOT NULL, report TEXT NOT NULL)""",
            "CREATE INDEX run_by_network ON run (network, started)",
            """
            CREATE TABLE acceptance (
                network TEXT NOT NULL, number INTEGER NOT NULL, night TEXT NOT NULL, reason TEXT NOT NULL,
                who TEXT NOT NULL, at TEXT NOT NULL,
                PRIMARY KEY (network, number))""",
            """
            CREATE TABLE name_part (
                network TEXT NOT NULL, first BIGINT NOT NULL, rows BIGINT NOT NULL, path TEXT NOT NULL,
                sha256 TEXT NOT NULL, bytes BIGINT NOT NULL,
                PRIMARY KEY (network, first))""",
            """
            CREATE TABLE alias (
                network TEXT NOT NULL, name TEXT NOT NULL, node BIGINT NOT NULL, valid_from TEXT NOT NULL,
                shown INTEGER NOT NULL,
                PRIMARY KEY (network, name))""",
        ),
    ),
)


def refuse_newer(where: str, done: int, *, known: int) -> None:
    """Raises StoreError when a newer version of swaygauge made the catalog: it has had more steps than are known."""
    if done > known:
        raise StoreError(
            f"{where}: made by a newer swaygauge (schema {done}; this version knows up to {known}). "
            "Use that version or a later one; nothing was changed."
        )
