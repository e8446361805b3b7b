"""The catalog's tables as SQLAlchemy knows them: one per row type. ``migrations`` creates them."""

from __future__ import annotations

from typing import Any, Final

import sqlalchemy as sa

from swaygauge.store import rows

NETWORK: Final = sa.table("network", sa.column("name"), sa.column("created"))
MIGRATION: Final = sa.table("migration", sa.column("number"), sa.column("name"), sa.column("applied"))


def _table(name: str, row: type[Any]) -> sa.TableClause:
    return sa.table(name, *(sa.column(column) for column in rows.columns(row)))


NIGHT: Final = _table("night", rows.NightRow)
PART: Final = _table("part", rows.PartRow)
STAGED_PART: Final = _table("staged_part", rows.PartRow)
FACT: Final = _table("fact", rows.FactRow)
STAGED_FACT: Final = _table("staged_fact", rows.FactRow)
CHECK_RESULT: Final = _table("check_result", rows.CheckRow)
ALERT: Final = _table("alert", rows.AlertRow)
RUN: Final = _table("run", rows.RunRow)
ACCEPTANCE: Final = _table("acceptance", rows.AcceptanceRow)
NAME_PART: Final = _table("name_part", rows.NamePartRow)
ALIAS: Final = _table("alias", rows.AliasRow)

ROW_TABLES: Final[dict[str, sa.TableClause]] = {
    table.name: table
    for table in (NIGHT, PART, STAGED_PART, FACT, STAGED_FACT, CHECK_RESULT, ALERT, RUN, ACCEPTANCE, NAME_PART, ALIAS)
}
