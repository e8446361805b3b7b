from __future__ import annotations

import io

import duckdb
import numpy as np
import pyarrow.parquet as pq
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from swaygauge.errors import StoreError
from swaygauge.store.parquet import ROW_GROUP, decode, encode

DTYPES = st.sampled_from(["bool", "i1", "u1", "i2", "u2", "i4", "u4", "i8", "u8", "f4", "f8"])


def columns(min_size: int = 0):
    return st.integers(min_size, 40).flatmap(
        lambda n: st.dictionaries(
            st.text("abcxyz_", min_size=1, max_size=5),
            DTYPES.flatmap(lambda t: hnp.arrays(t, n)),
            min_size=1,
            max_size=4,
        )
    )


@settings(max_examples=150, deadline=None)
@given(columns())
def test_columns_come_back_bit_for_bit(arrays):
    data, rows = encode(arrays)
    back = decode(bytes(data))
    assert list(back) == list(arrays)
    for name, array in arrays.items():
        assert len(array) == rows
        assert back[name].dtype == array.dtype
        assert back[name].tobytes() == array.tobytes()  # NaN payloads and signed zeros too
        assert not back[name].flags.writeable


@settings(max_examples=50, deadline=None)
@given(
    st.dictionaries(st.text("abc", min_size=1), DTYPES.flatmap(lambda t: hnp.arrays(t, st.integers(0, 30))), min_size=1)
)
def test_ragged_arrays_come_back_bit_for_bit(arrays):
    data, rows = encode(arrays, ragged=True)
    back = decode(bytes(data))
    assert rows == 1
    assert {name: (a.dtype, a.tobytes()) for name, a in back.items()} == {
        name: (a.dtype, a.tobytes()) for name, a in arrays.items()
    }


def test_same_columns_same_bytes_whatever_their_memory_layout():
    ids = np.arange(200_000, dtype=np.int32)
    value = np.sqrt(ids.astype(float))
    plain = bytes(encode({"id": ids, "value": value})[0])
    strided = np.empty((len(ids), 2))
    strided[:, 0] = value
    big_endian = value.astype(">f8").astype("f8")
    assert bytes(encode({"id": ids.copy(), "value": strided[:, 0]})[0]) == plain
    assert bytes(encode({"id": ids, "value": big_endian})[0]) == plain
    assert bytes(encode({"id": ids, "value": value + 1e-12})[0]) != plain


def test_one_node_is_found_by_its_row_group():
    ids = np.arange(3 * ROW_GROUP, dtype=np.int32)
    metadata = pq.read_metadata(io.BytesIO(encode({"id": ids, "x": ids * 0.5})[0]))
    spans = [metadata.row_group(at).column(0).statistics for at in range(metadata.num_row_groups)]
    assert [(s.min, s.max) for s in spans] == [(at * ROW_GROUP, (at + 1) * ROW_GROUP - 1) for at in range(3)]
    assert "DELTA_BINARY_PACKED" in metadata.row_group(0).column(0).encodings
    assert metadata.row_group(0).column(0).has_offset_index


def test_duckdb_reads_the_same_numbers(tmp_path):
    value = np.array([1.5, np.nan, -0.0, np.inf])
    (tmp_path / "x.parquet").write_bytes(
        encode({"id": np.arange(4, dtype=np.int32), "value": value, "flag": np.array([1, 0, 1, 0], bool)})[0]
    )
    back = duckdb.connect().execute("SELECT * FROM read_parquet(?)", [str(tmp_path / "x.parquet")]).fetchnumpy()
    assert back["id"].tolist() == [0, 1, 2, 3]
    np.testing.assert_array_equal(back["value"], value)
    assert back["flag"].tolist() == [True, False, True, False]


@pytest.mark.parametrize(
    ("arrays", "complaint"),
    [
        ({}, "without columns"),
        ({"x": np.zeros((2, 2))}, "2 dimension"),
        ({"x": np.array(["a"])}, "<U1"),
        ({"x": np.array([object()])}, "object"),
        ({"x": np.zeros(2, complex)}, "complex128"),
        ({"x": np.array(["2031-01-01"], "M8[D]")}, "datetime64"),
        ({"x": np.zeros(2), "y": np.zeros(3)}, "'x': 2, 'y': 3"),
    ],
)
def test_what_is_no_column_is_refused(arrays, complaint):
    with pytest.raises(StoreError, match=complaint):
        encode(arrays)
