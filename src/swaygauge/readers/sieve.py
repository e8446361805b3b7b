"""Row by row: keeps what is a link, tallies what is none."""

from __future__ import annotations

from array import array

import numpy as np
import pyarrow as pa

from swaygauge.readers import faults
from swaygauge.readers.columns import Columns
from swaygauge.readers.faults import Faults
from swaygauge.readers.lines import Record
from swaygauge.readers.options import ReadOptions
from swaygauge.readers.raw import Rows
from swaygauge.records import Floats, frozen

BATCH = 65_536  # rows kept as Python text at a time


class Sieve:
    """Takes the rows of one CSV file in their order."""

    def __init__(self, columns: Columns, options: ReadOptions) -> None:
        self._columns = columns
        self._limit = options.max_name_bytes
        self._hint = "" if options.comment else " (a comment? set reader.comment = '#')"
        self._tally = Faults()
        self._names: tuple[list[str], list[str]] = ([], [])
        self._values = array("d")
        self._chunks: tuple[list[pa.Array], list[pa.Array]] = ([], [])
        self._weights: list[Floats] = []

    def put(self, record: Record) -> None:
        """One row in doubt."""
        columns, fields = self._columns, record.fields
        if record.broken:
            # where the next row begins was not known, so every line up to there is lost, and counted
            self._tally.add(record.where, faults.quoting_fault(record.broken, fields[0]), rows=record.lines)
            return
        if len(fields) != columns.count:
            hint = self._hint if fields[0].startswith("#") else ""
            self._tally.add(record.where, faults.columns_fault(fields, columns.count, hint), rows=record.lines)
            return
        source, target = fields[columns.endorser], fields[columns.endorsed]
        fault = faults.name_fault(columns.names[0], source, limit=self._limit) or faults.name_fault(
            columns.names[1], target, limit=self._limit
        )
        if fault is None and columns.weight is not None:
            weight = faults.weight(columns.names[2], fields[columns.weight])
            if isinstance(weight, float):
                self._values.append(weight)
            else:
                fault = weight
        if fault is not None:
            self._tally.add(record.where, fault)
            return
        self._names[0].append(source)
        self._names[1].append(target)
        if len(self._names[0]) == BATCH:
            self._flush()

    def put_clean(self, endorser: pa.ChunkedArray, endorsed: pa.ChunkedArray, weight: Floats | None) -> None:
        """Rows of which each is known to be a link."""
        self._flush()
        for chunks, names in zip(self._chunks, (endorser, endorsed), strict=True):
            chunks += names.chunks
        if weight is not None:
            self._weights.append(weight)

    def _flush(self) -> None:
        for chunks, names in zip(self._chunks, self._names, strict=True):
            chunks.append(pa.array(names, pa.string()))
            names.clear()
        self._weights.append(np.array(self._values, np.float64))
        self._values = array("d")

    def rows(self, *, sha256: str, size: int) -> Rows:
        """Everything that was kept. sha256, size: of the stored file."""
        self._flush()
        return Rows(
            endorser=pa.chunked_array(self._chunks[0]),
            endorsed=pa.chunked_array(self._chunks[1]),
            weight=None if self._columns.weight is None else frozen(np.concatenate(self._weights)),
            faults=self._tally,
            sha256=sha256,
            size=size,
        )
