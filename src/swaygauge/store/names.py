"""The name table: every node name a network has ever shown, once. A name's position is the node's id, for good.

The table only grows. It is kept as Parquet parts that hold consecutive ids; the catalog lists them. Whoever appends
holds the catalog's write lock from looking to committing, so two processes cannot give one id twice.
"""

from __future__ import annotations

import threading
from collections.abc import Sequence
from datetime import date
from pathlib import Path
from typing import Any, Final, TypeAlias

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.parquet as pq
import sqlalchemy as sa

from swaygauge.errors import NotInStore, StoreError
from swaygauge.records import Ids
from swaygauge.store import queries
from swaygauge.store.catalog import Catalog, asking, delete_rows, hold_network_row, insert_rows
from swaygauge.store.files import read_whole, sha256_of, write_whole
from swaygauge.store.layout import name_part_path
from swaygauge.store.parquet import encode_table
from swaygauge.store.rows import NamePartRow

MOST_PARTS: Final = 16  # more small parts than this are merged
EPOCH: Final = date(1970, 1, 1).toordinal()
MOST_IDS: Final = 2**31 - 1

Names: TypeAlias = pa.Array | pa.ChunkedArray | Sequence[str]


class NameTable:
    """Names of one network <-> int32 ids. Safe to share between threads; sees what other processes append."""

    def __init__(self, catalog: Catalog, workspace: Path, network: str) -> None:
        self._catalog = catalog
        self._workspace = workspace
        self._network = network
        self._guard = threading.RLock()
        self._texts: pa.Array = pa.array([], pa.large_string())
        self._days: Ids = np.empty(0, np.int32)  # night first seen, as a day number (date.toordinal())

    def __len__(self) -> int:
        with self._guard:
            self._refresh(queries.name_parts(self._catalog.ask, self._network))
            return len(self._texts)

    def lookup(self, names: Names) -> Ids:
        """The id of each name; -1 where the network has never shown it."""
        wanted = _as_texts(names).dictionary_encode()
        with self._guard:
            self._refresh(queries.name_parts(self._catalog.ask, self._network))
            return _spread(self._find(wanted.dictionary), wanted)

    def intern(self, names: Names, *, night: date) -> Ids:
        """The id of each name; names never seen get the next ids in the order given, and ``night`` as first seen.

        A transaction of its own. Repeating it, also after a kill, changes nothing. The network must be in the catalog.
        """
        wanted = _as_texts(names).dictionary_encode()  # each name once, in the order of its first place
        distinct = wanted.dictionary
        with self._guard:
            self._refresh(queries.name_parts(self._catalog.ask, self._network))
            ids = self._find(distinct)
            if (ids >= 0).all():
                return _spread(ids, wanted)
            with self._catalog.writing() as connection:
                hold_network_row(connection, self._network)
                parts = queries.name_parts(asking(connection), self._network)
                if self._refresh(parts):  # another process appended since the look-up
                    ids = self._find(distinct)
                new = ids < 0
                if new.any():
                    first = self._append(connection, parts, distinct.filter(pa.array(new)), night)
                    ids[new] = np.arange(first, first + int(new.sum()))
            # the new names enter this object's memory at the next look, from what was committed
            return _spread(ids, wanted)

    def first_seen(self, ids: Ids) -> Ids:
        """The night that first interned each id, as a day number (``date.toordinal()``). Raises NotInStore."""
        with self._guard:
            days: Ids = self._days[self._known(ids)]
            return days

    def texts(self, ids: Ids | Sequence[int]) -> list[str]:
        """The name of each id, exactly as it was first seen. Raises NotInStore."""
        with self._guard:
            at = self._known(np.asarray(ids, np.int64))
            names: list[str] = self._texts.take(pa.array(at)).to_pylist()
            return names

    def _known(self, ids: Any) -> Any:
        """The ids, once the table is sure to hold them all."""
        if len(ids) and ids.max() >= len(self._texts):
            self._refresh(queries.name_parts(self._catalog.ask, self._network))
        if len(ids) and (ids.min() < 0 or ids.max() >= len(self._texts)):
            raise NotInStore(
                f"{self._network}: ids must be 0 to {len(self._texts) - 1}, got {ids.min()} to {ids.max()}."
            )
        return ids

    def _find(self, distinct: pa.Array) -> Ids:
        """The id of each of some different names, -1 if unknown. It hashes those few, not the whole table."""
        ids = np.full(len(distinct), -1, np.int32)
        if len(self._texts) and len(distinct):
            found = pc.index_in(self._texts, value_set=distinct)
            ids[found.drop_null().to_numpy()] = np.flatnonzero(found.is_valid().to_numpy(zero_copy_only=False))
        return ids

    def _refresh(self, parts: Sequence[NamePartRow]) -> bool:
        """Take in what was appended since; whether there was anything."""
        known = len(self._texts)
        if sum(part.rows for part in parts) <= known:
            return False
        tables = [read_name_part(self._workspace, part) for part in parts if part.first + part.rows > known]
        table = pa.concat_tables(tables)
        table = table.slice(max(0, known - next(p.first for p in parts if p.first + p.rows > known)))
        fresh = table.column("name").cast(pa.large_string()).combine_chunks()
        self._texts = pa.concat_arrays([self._texts, fresh])
        days = table.column("first_seen").cast(pa.int32()).to_numpy() + np.int32(EPOCH)
        self._days = np.concatenate([self._days, days]).astype(np.int32)
        return True

    def _append(self, connection: sa.Connection, parts: Sequence[NamePartRow], new: pa.Array, night: date) -> int:
        """Write the names as a part of their own; the first of their ids."""
        first = parts[-1].first + parts[-1].rows if parts else 0
        if first + len(new) > MOST_IDS:
            raise StoreError(f"{self._network}: more than {MOST_IDS} names; ids are 32 bits wide.")
        table = _name_table(first, new, pa.repeat(pa.scalar(night, pa.date32()), len(new)))
        parts = (*parts, self._write(first, table))
        insert_rows(connection, "name_part", parts[-1:])
        if len(parts) > MOST_PARTS:
            self._merge(connection, parts)
        return first

    def _merge(self, connection: sa.Connection, parts: Sequence[NamePartRow]) -> None:
        """Replace the newest parts by one. A part twice as large as all after it stays, so little is written again."""
        start, rows = len(parts) - 1, parts[-1].rows
        while start > 0 and parts[start - 1].rows <= 2 * rows:
            start -= 1
            rows += parts[start].rows
        merged = parts[start:]
        table = pa.concat_tables([read_name_part(self._workspace, part) for part in merged])
        for part in merged:
            delete_rows(connection, "name_part", network=self._network, first=part.first)
        insert_rows(connection, "name_part", [self._write(merged[0].first, table)])

    def _write(self, first: int, table: pa.Table) -> NamePartRow:
        data, rows = encode_table(table)
        sha256 = sha256_of(data)
        path = name_part_path(self._network, first, sha256)
        write_whole(self._workspace / path, data, sha256)
        return NamePartRow(self._network, first, rows, path, sha256, len(data))


def read_name_part(workspace: Path, part: NamePartRow) -> pa.Table:
    """Columns id, name, first_seen of one part. Raises Damaged."""
    data = read_whole(
        workspace / part.path,
        size=part.bytes,
        sha256=part.sha256,
        what=f"{part.network}: names from id {part.first}",
        todo="Restore the file from a backup: ids cannot be made again.",
    )
    return pq.read_table(pa.BufferReader(data), use_threads=False)


def _spread(ids: Ids, wanted: pa.DictionaryArray) -> Ids:
    """The id of each name from those of the different ones."""
    of_each: Ids = ids[wanted.indices.to_numpy(zero_copy_only=False)]
    return of_each


def _name_table(first: int, names: pa.Array, nights: pa.Array) -> pa.Table:
    ids = pa.array(np.arange(first, first + len(names), dtype=np.int32))
    return pa.table({"id": ids, "name": names, "first_seen": nights})


def _as_texts(names: Names) -> pa.Array:
    if isinstance(names, pa.ChunkedArray):
        names = names.combine_chunks()
    try:
        texts = names.cast(pa.large_string()) if isinstance(names, pa.Array) else pa.array(names, pa.large_string())
    except (pa.ArrowInvalid, pa.ArrowTypeError, UnicodeEncodeError) as error:
        raise StoreError(f"names must be text that UTF-8 can carry: {error}") from None
    if texts.null_count:
        raise StoreError(
            f"{texts.null_count} of {len(texts)} names are null; leave such rows out before asking for ids."
        )
    return texts
