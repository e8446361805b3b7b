"""Parquet edge lists: names as text or integers, weights of any numeric type."""

from __future__ import annotations

import hashlib
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.parquet as pq

from swaygauge.errors import UnreadableFile
from swaygauge.readers import faults
from swaygauge.readers.columns import Columns, find_columns
from swaygauge.readers.faults import Faults
from swaygauge.readers.options import ReadOptions
from swaygauge.readers.raw import Rows
from swaygauge.readers.stream import CODECS, check_file
from swaygauge.records import Floats, frozen


def read_parquet(path: Path, options: ReadOptions) -> Rows:
    """The rows of a Parquet file.

    Integer names become their decimal digits. Raises UnreadableFile (not Parquet, or a column of another type),
    MissingColumn, NoLinks.
    """
    check_file(path)
    if path.suffix in CODECS:
        raise UnreadableFile(f"{path.name}: Parquet compresses inside; expected a plain file. Unpack it.")
    try:
        data = pa.memory_map(str(path))
        digest = hashlib.sha256(data.read_buffer()).hexdigest()
        size = data.size()
        file = pq.ParquetFile(data)
        schema = file.schema_arrow
        columns = find_columns(path.name, schema.names, options, count=len(schema.names))
        _check_types(path.name, schema, columns)
        table = pa.table({str(at): file.read(columns=[schema.names[at]]).column(0) for at in columns.used})
    except (pa.ArrowException, OSError) as error:
        raise UnreadableFile(
            f"{path.name}: expected a complete Parquet file, but reading failed ({str(error).splitlines()[0]}). "
            f"Was it still being written? Fetch the file again."
        ) from None
    tally = Faults()
    good = _clean_columns(table, options)
    if good is None:
        table = _judge(table, columns, options, tally)
        good = _as_text(table.column(0)), _as_text(table.column(1))
    weight = None if columns.weight is None else frozen(_as_floats(table.column(2)))
    return Rows(good[0], good[1], weight, tally, digest, size)


def _check_types(name: str, schema: pa.Schema, columns: Columns) -> None:
    for at, role in zip(columns.used, columns.names, strict=True):
        kind = schema.types[at]
        plain = kind.value_type if pa.types.is_dictionary(kind) else kind
        if at == columns.weight:
            usable = pa.types.is_integer(kind) or pa.types.is_floating(kind) or pa.types.is_decimal(kind)
            wanted = "numbers"
        else:
            usable = pa.types.is_integer(plain) or _is_text(plain)
            wanted = "text or integers"
        if not usable:
            raise UnreadableFile(f"{name}: {role} must hold {wanted}, got type {kind}. Write it with another type.")


def _is_text(kind: pa.DataType) -> bool:
    types = pa.types
    return bool(
        types.is_string(kind)
        or types.is_large_string(kind)
        or types.is_string_view(kind)
        or types.is_binary(kind)
        or types.is_large_binary(kind)
    )


def _as_text(column: pa.ChunkedArray) -> pa.ChunkedArray:
    return column if column.type == pa.string() else column.cast(pa.string())


def _as_floats(column: pa.ChunkedArray) -> Floats:
    values: Floats = column.cast(pa.float64(), safe=False).to_numpy()
    return values


def _clean_columns(table: pa.Table, options: ReadOptions) -> tuple[pa.ChunkedArray, pa.ChunkedArray] | None:
    """The two columns of names, or None unless every row is clean."""
    if any(column.null_count for column in table.columns):
        return None
    if table.num_columns == 3:
        weight = _as_floats(table.column(2))
        if not (np.isfinite(weight) & (weight > 0)).all():
            return None
    try:
        names = _as_text(table.column(0)), _as_text(table.column(1))
        for column in names:
            column.validate(full=True)
            lengths = pc.min_max(pc.binary_length(column)).as_py()
            if lengths["min"] is None or lengths["min"] < 1 or lengths["max"] > options.max_name_bytes:
                return None
            if pc.any(pc.match_substring(column, "\0")).as_py():
                return None
    except pa.ArrowException:
        return None
    return names


def _judge(table: pa.Table, columns: Columns, options: ReadOptions, tally: Faults) -> pa.Table:
    """The good rows; every other is tallied with its number, counted from 1."""
    keep = np.ones(len(table), np.bool_)
    row = 0
    for batch in table.to_batches(max_chunksize=65_536):
        names = [_plain(batch.column(at)) for at in (0, 1)]
        weight: list[float | None] = [1.0] * len(batch)
        if columns.weight is not None:
            weight = batch.column(2).cast(pa.float64(), safe=False).to_pylist()
        for source, target, value in zip(*names, weight, strict=True):
            fault = (
                faults.name_fault(columns.names[0], source, limit=options.max_name_bytes)
                or faults.name_fault(columns.names[1], target, limit=options.max_name_bytes)
                or (faults.value_fault(columns.names[-1], value) if columns.weight is not None else None)
            )
            if fault is not None:
                tally.add(f"row {row + 1}", fault)
                keep[row] = False
            row += 1
    return table.filter(pa.array(keep))


def _plain(column: Any) -> list[str | None]:
    """Names of a batch as Python text; bytes that are not UTF-8 become lone surrogates."""
    if pa.types.is_dictionary(column.type):
        column = column.dictionary_decode()
    if pa.types.is_integer(column.type):
        return [None if value is None else str(value) for value in column.to_pylist()]
    wide = pa.large_binary() if pa.types.is_large_string(column.type) else pa.binary()
    raw = column if pa.types.is_binary(column.type) or pa.types.is_large_binary(column.type) else column.cast(wide)
    return [None if name is None else name.decode("utf-8", "surrogateescape") for name in raw.to_pylist()]
