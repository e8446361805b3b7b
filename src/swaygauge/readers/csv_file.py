"""CSV and TSV. Two roads, one truth: a vectorised one for text in which every row is clean, a careful one that decides
row by row. The fast road never decides that a row is bad. It first takes the file as a whole; at the first doubt the
file is read again in blocks, and only blocks that are in doubt go the careful road.
"""

from __future__ import annotations

import io
import itertools
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.csv

from swaygauge.errors import NoLinks, UnreadableFile
from swaygauge.readers.columns import Columns, find_columns
from swaygauge.readers.faults import Faults
from swaygauge.readers.lines import Record, open_text, read_records
from swaygauge.readers.options import DELIMITERS, ReadOptions
from swaygauge.readers.plain import Plain, Unclean
from swaygauge.readers.raw import Rows
from swaygauge.readers.sieve import Sieve
from swaygauge.readers.stream import PIECE, Source, open_source
from swaygauge.records import Floats, frozen


def read_csv(path: Path, options: ReadOptions) -> Rows:
    """The rows of a CSV or TSV file, plain, gzip or zstd.

    Raises UnreadableFile, MissingColumn, NoLinks.
    """
    rows = read_fast(path, options)
    return read_careful(path, options) if rows is None else rows


def read_fast(path: Path, options: ReadOptions) -> Rows | None:
    """The rows, or None unless every one of them is clean."""
    with open_source(path) as source:
        columns, _ = _open(source, options)
        parsed = _parse(_Gate(source, _plain(options)), columns, options)
        if parsed is None:
            return None
        return Rows(*parsed, Faults(), source.sha256, source.size)


def read_careful(path: Path, options: ReadOptions, *, block_size: int = PIECE) -> Rows:
    """The rows, with the line of every bad one. block_size: about how many bytes are taken or doubted together."""
    with open_source(path) as source:
        columns, passed = _open(source, options)
        sieve = Sieve(columns, options)
        while block := source.whole_lines(block_size):
            parsed = _parse_block(block, columns, options)
            if parsed is not None:
                sieve.put_clean(*parsed)
            else:
                records = list(_records(io.BytesIO(block), options, passed=passed))
                if any(record.broken for record in records):
                    # where a row ends is unknown: from here to the end of the file, one row after the other
                    source.take_back(block)
                    for record in _records(source, options, passed=passed):
                        sieve.put(record)
                    break
                for record in records:
                    sieve.put(record)
            passed += _count_lines(block)
        return sieve.rows(sha256=source.sha256, size=source.size)


def _open(source: Source, options: ReadOptions) -> tuple[Columns, int]:
    """The roles of the columns, and how many lines stand before the first row, where the source is left."""
    name = source.path.name
    start = source.whole_lines()
    first = next(_records(io.BytesIO(start), options), None)
    while first is None and (more := source.whole_lines()):  # nothing but comments so far
        start += more
        first = next(_records(io.BytesIO(start), options), None)
    if first is None:
        raise NoLinks(f"{name}: the file holds no row; expected at least one link. Fetch the file again.")
    if first.broken:
        raise UnreadableFile(f"{name}, {first.where}: {first.broken}. Correct the quotes of the first row.")
    columns = find_columns(name, first.fields if options.header else None, options, count=len(first.fields))
    passed = first.line - 1 + (first.lines if options.header else 0)
    lines = itertools.islice(open_text(io.BytesIO(start)), passed)
    source.take_back(start[sum(len(line.encode("utf-8", "surrogateescape")) for line in lines) :])
    return columns, passed


def _records(stream: Source | io.BytesIO, options: ReadOptions, *, passed: int = 0) -> Iterator[Record]:
    delimiter = options.delimiter or DELIMITERS[options.format]
    text = open_text(stream)
    return read_records(text, delimiter=delimiter, quote=options.quote, comment=options.comment, passed=passed)


def _count_lines(block: bytes) -> int:
    return block.count(b"\n") + block.count(b"\r") - block.count(b"\r\n")


Parsed = tuple[pa.ChunkedArray, pa.ChunkedArray, Floats | None]  # endorser, endorsed, weight


class _Gate:
    """A readable file that passes on what is plain and raises Unclean at anything else."""

    closed = False

    def __init__(self, source: Source, plain: Plain) -> None:
        self._source = source
        self._plain = plain
        self._ready = b""

    def read(self, size: int) -> bytes:
        """At most ``size`` bytes; empty at the end."""
        if not self._ready:
            self._ready = self._source.whole_lines()
            self._plain.check(self._ready)
            if not self._ready and self._plain.opened is not None:
                raise Unclean
        piece, self._ready = self._ready[:size], self._ready[size:]
        return piece

    def close(self) -> None:
        self.closed = True


def _plain(options: ReadOptions) -> Plain:
    delimiter = options.delimiter or DELIMITERS[options.format]
    return Plain(delimiter=delimiter, quote=options.quote, comment=options.comment)


def _parse_block(block: bytes, columns: Columns, options: ReadOptions) -> Parsed | None:
    plain = _plain(options)
    try:
        plain.check(block)
    except Unclean:
        return None
    return None if plain.opened is not None else _parse(pa.BufferReader(block), columns, options)


def _parse(stream: Any, columns: Columns, options: ReadOptions) -> Parsed | None:
    """All rows of the stream, or None unless every one of them is clean."""
    try:
        table = pyarrow.csv.read_csv(
            stream,
            read_options=pyarrow.csv.ReadOptions(
                column_names=[str(at) for at in range(columns.count)], block_size=4 * PIECE
            ),
            parse_options=pyarrow.csv.ParseOptions(
                delimiter=options.delimiter or DELIMITERS[options.format],
                quote_char=options.quote or False,
                newlines_in_values=bool(options.quote),
            ),
            convert_options=pyarrow.csv.ConvertOptions(
                include_columns=[str(at) for at in columns.used],
                column_types={str(at): pa.string() for at in columns.used},
                strings_can_be_null=False,
            ),
        )
        weight = None if columns.weight is None else pc.cast(table.column(2), pa.float64()).to_numpy()
    except (Unclean, pa.ArrowException):
        return None
    for names in (table.column(0), table.column(1)):
        lengths = pc.min_max(pc.binary_length(names)).as_py()
        if lengths["min"] is None or lengths["min"] < 1 or lengths["max"] > options.max_name_bytes:
            return None
    if weight is not None and not (np.isfinite(weight) & (weight > 0)).all():
        return None
    return table.column(0), table.column(1), None if weight is None else frozen(weight)
