"""Named NumPy columns as Parquet bytes and back: the same columns always give the same bytes.

Integers are delta-coded (ids are sorted, so most of a column is steps of one), everything is zstd-compressed, row
groups are small and carry minima and maxima, so that one node's row is found without reading the rest.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Final

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
from numpy.typing import NDArray

from swaygauge.errors import StoreError

ROW_GROUP: Final = 65_536
PAGE_BYTES: Final = 16_384  # small pages: one node's history unpacks a third less
Columns = Mapping[str, NDArray[Any]]


def encode(columns: Columns, *, ragged: bool = False) -> tuple[memoryview, int]:
    """Parquet bytes and the number of rows.

    columns: 1-D arrays of numbers or flags, all of one length. ragged: arrays of any lengths, kept as one row of lists.
    Raises StoreError when they are not.
    """
    _check(columns, ragged=ragged)
    arrays = {name: pa.array(np.ascontiguousarray(array)) for name, array in columns.items()}
    if ragged:
        arrays = {
            name: pa.LargeListArray.from_arrays(pa.array([0, len(array)], pa.int64()), array)
            for name, array in arrays.items()
        }
    return encode_table(pa.table(arrays))


def encode_table(table: pa.Table) -> tuple[memoryview, int]:
    """Parquet bytes and the number of rows of an Arrow table."""
    sink = pa.BufferOutputStream()
    pq.write_table(
        table,
        sink,
        compression="zstd",
        compression_level=3,
        row_group_size=ROW_GROUP,
        data_page_size=PAGE_BYTES,
        use_dictionary=False,
        column_encoding={
            field.name: "DELTA_BINARY_PACKED" for field in table.schema if pa.types.is_integer(field.type)
        },
        write_page_index=True,
        store_schema=False,
    )
    return memoryview(sink.getvalue()), table.num_rows


def decode(data: bytes) -> dict[str, NDArray[Any]]:
    """The columns as read-only arrays."""
    table = pq.read_table(pa.BufferReader(data), use_threads=False)
    columns: dict[str, NDArray[Any]] = {}
    for name, column in zip(table.column_names, table.columns, strict=True):
        whole = column.combine_chunks()
        if pa.types.is_list(whole.type) or pa.types.is_large_list(whole.type):
            whole = whole.flatten()
        array = whole.to_numpy(zero_copy_only=False)
        array.setflags(write=False)
        columns[name] = array
    return columns


def _check(columns: Columns, *, ragged: bool) -> None:
    if not columns:
        raise StoreError("a part without columns cannot be stored; give at least one array.")
    for name, array in columns.items():
        if array.ndim != 1 or array.dtype.kind not in "biuf":
            raise StoreError(
                f"column {name!r}: expected a one-dimensional array of numbers or flags, got {array.ndim} "
                f"dimension(s) of {array.dtype}."
            )
    lengths = {name: len(array) for name, array in columns.items()}
    if not ragged and len(set(lengths.values())) > 1:
        raise StoreError(
            f"columns of one part must have one length, got {lengths}; use ragged=True for a bag of arrays."
        )
