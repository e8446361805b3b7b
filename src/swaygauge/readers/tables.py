"""Small CSV files that a person keeps: aliases, trusted cores. A header, '#' comment lines, every mistake at once."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from swaygauge.errors import BadRows, MissingColumn
from swaygauge.readers import faults
from swaygauge.readers.faults import Faults
from swaygauge.readers.lines import open_text, read_records
from swaygauge.readers.stream import open_source
from swaygauge.visible import visible

COMMENT = "#"


@dataclass(frozen=True)
class SmallTable:
    """The rows that have the right shape, with the line each begins on."""

    rows: list[tuple[int, list[str]]]
    faults: Faults
    sha256: str
    size: int


def read_table(path: Path, columns: Sequence[str]) -> SmallTable:
    """The rows of a CSV file whose header is exactly ``columns``. A file without a single byte is an empty table.

    Raises UnreadableFile, MissingColumn (another header).
    """
    rows: list[tuple[int, list[str]]] = []
    tally = Faults()
    if path.is_file() and not path.stat().st_size:
        return SmallTable(rows, tally, hashlib.sha256().hexdigest(), 0)
    with open_source(path) as source:
        records = read_records(open_text(source), delimiter=",", quote='"', comment=COMMENT)
        header = next(records, None)
        found = [] if header is None else header.fields
        if found != list(columns):
            there = visible(",".join(found))
            raise MissingColumn(f"{path.name}: the first row must be '{','.join(columns)}', got '{there}'. Add it.")
        for record in records:
            if record.broken:
                tally.add(record.where, faults.quoting_fault(record.broken, record.fields[0]), rows=record.lines)
            elif len(record.fields) != len(columns):
                tally.add(record.where, faults.columns_fault(record.fields, len(columns)), rows=record.lines)
            else:
                rows.append((record.line, record.fields))
        return SmallTable(rows, tally, source.sha256, source.size)


def refuse_faults(path: Path, tally: Faults) -> None:
    """Raises BadRows when there is any."""
    if tally.total:
        raise BadRows(path.name, tally.total, tally.samples, advice="Correct these lines of the file.")
