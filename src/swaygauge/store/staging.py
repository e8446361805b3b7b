"""A night under construction: parts and facts that only the run that builds it looks at."""

from __future__ import annotations

from datetime import date
from pathlib import Path
from typing import Any

from numpy.typing import NDArray

from swaygauge.errors import NotInStore
from swaygauge.store import queries
from swaygauge.store.catalog import Catalog, delete_rows, insert_rows
from swaygauge.store.files import read_whole, sha256_of, write_whole
from swaygauge.store.layout import check_fact, check_kind, part_path
from swaygauge.store.parquet import Columns, decode, encode
from swaygauge.store.rows import FactRow, PartRow


def stage_part(
    catalog: Catalog,
    workspace: Path,
    network: str,
    night: date,
    *,
    kind: str,
    score: str,
    columns: Columns,
    ragged: bool,
) -> None:
    """Write the part's file, then the staged row that names it, replacing one staged before."""
    check_kind(kind, score)
    data, rows = encode(columns, ragged=ragged)
    sha256 = sha256_of(data)
    path = part_path(network, night, kind, score, sha256)
    write_whole(workspace / path, data, sha256)
    row = PartRow(network, night, kind, score, path, sha256, len(data), rows)
    with catalog.writing() as connection:
        delete_rows(connection, "staged_part", network=network, night=str(night), kind=kind, score=score)
        insert_rows(connection, "staged_part", [row])


def stage_fact(catalog: Catalog, network: str, night: date, *, name: str, value: Any) -> None:
    """Write a staged fact, replacing one staged before."""
    check_fact(name)
    row = FactRow(network, night, name, value)
    with catalog.writing() as connection:
        delete_rows(connection, "staged_fact", network=network, night=str(night), name=name)
        insert_rows(connection, "staged_fact", [row])


def clear_staging(catalog: Catalog, network: str, night: date) -> None:
    """Forget what a night has staged. The files are swept at a later publish."""
    with catalog.writing() as connection:
        for table in ("staged_part", "staged_fact"):
            delete_rows(connection, table, network=network, night=str(night))


def read_part(
    catalog: Catalog, workspace: Path, network: str, night: date, *, kind: str, score: str, staged: bool
) -> dict[str, NDArray[Any]]:
    """The columns of a part, its bytes checked against the catalog. Raises NotInStore, Damaged."""
    row = queries.part(catalog.ask, network, night, kind, score, staged=staged)
    what = f"{network}, night {night}, {' '.join(word for word in (kind, score) if word)}"
    if row is None:
        raise NotInStore(f"{what}: {'not staged' if staged else 'not in the store'}.")
    return decode(read_part_bytes(workspace, row, what))


def read_part_bytes(workspace: Path, row: PartRow, what: str) -> bytes:
    """The bytes of a part's file. Raises Damaged."""
    todo = f"Run night {row.night} of {row.network} again, or restore the file from a backup."
    return read_whole(workspace / row.path, size=row.bytes, sha256=row.sha256, what=what, todo=todo)
