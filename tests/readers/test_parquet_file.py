"""Parquet edge lists: the same truth as CSV, rows named by number."""

import gzip
import hashlib
from decimal import Decimal

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from swaygauge.errors import BadRows, MissingColumn, NoLinks, UnreadableFile
from swaygauge.readers import ReadOptions, read_links

OPTIONS = ReadOptions(format="parquet")
WEIGHTED = ReadOptions(format="parquet", weight="w")


def put(tmp_path, columns):
    path = tmp_path / "links.parquet"
    pq.write_table(columns if isinstance(columns, pa.Table) else pa.table(columns), path)
    return path


def links(raw):
    names = raw.names.to_pylist()
    return [(names[source], names[target]) for source, target in zip(raw.source_code, raw.target_code, strict=True)]


@pytest.mark.parametrize(
    "kind",
    [
        pa.string(),
        pa.large_string(),
        pa.string_view(),
        pa.binary(),
        pa.large_binary(),
        pa.dictionary(pa.int32(), pa.string()),
    ],
    ids=str,
)
def test_every_kind_of_text(tmp_path, kind):
    path = put(
        tmp_path, {"source": pa.array(["b", "a", "é\n"]).cast(kind), "target": pa.array(["a", "c", "a"]).cast(kind)}
    )
    raw = read_links(path, OPTIONS)
    assert links(raw) == [("b", "a"), ("a", "c"), ("é\n", "a")]
    assert raw.names.to_pylist() == ["a", "b", "c", "é\n"]
    assert raw.origin.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    assert (raw.origin.size, raw.origin.reader) == (path.stat().st_size, "parquet")


def test_integers_are_names_too(tmp_path):
    path = put(tmp_path, {"source": pa.array([7, 2**40]), "target": pa.array([0, 7], pa.uint8())})
    assert links(read_links(path, OPTIONS)) == [("7", "0"), (str(2**40), "7")]


@pytest.mark.parametrize("kind", [pa.int8(), pa.uint64(), pa.float32(), pa.float64(), pa.decimal128(5, 2)], ids=str)
def test_every_kind_of_weight(tmp_path, kind):
    values = [Decimal(2), Decimal(3)] if pa.types.is_decimal(kind) else [2, 3]
    path = put(tmp_path, {"source": ["a", "b"], "target": ["b", "c"], "w": pa.array(values).cast(kind)})
    raw = read_links(path, WEIGHTED)
    assert raw.weight is not None
    assert raw.weight.dtype == np.float64
    assert raw.weight.tolist() == [2.0, 3.0]


def test_bad_rows_are_named_by_number_or_dropped(tmp_path):
    text = pa.array([b"a", b"", None, b"caf\xe9", b"n\0l", b"x" * 3000, b"f", b"g", b"h", b"i"], pa.binary())
    weight = [1.0, 1.0, 1.0, 1.0, 1.0, 1.0, float("nan"), -1.0, None, 5.0]
    path = put(tmp_path, {"source": text, "target": ["t"] * 10, "w": pa.array(weight)})
    with pytest.raises(BadRows) as error:
        read_links(path, WEIGHTED)
    told = error.value.problems
    assert [problem.split(":")[0] for problem in told] == [f"row {row}" for row in range(2, 10)]
    for problem, words in zip(
        told,
        [
            "is empty",
            "is empty",
            r"must be UTF-8, got 'caf\xe9'",
            "NUL",
            "3,000 bytes",
            "got 'nan'",
            "got '-1.0'",
            "missing",
        ],
        strict=True,
    ):
        assert words in problem
    raw = read_links(path, ReadOptions(format="parquet", weight="w", bad_rows="drop"))
    assert links(raw) == [("a", "t"), ("i", "t")]
    assert raw.weight is not None
    assert raw.weight.tolist() == [1.0, 5.0]
    assert dict(raw.origin.dropped) == {
        "empty name": 2,
        "name not UTF-8": 1,
        "NUL in name": 1,
        "name too long": 1,
        "weight not finite": 1,
        "weight not above zero": 1,
        "weight not a number": 1,
    }
    assert raw.origin.rows == 10


def test_integer_names_that_are_missing(tmp_path):
    path = put(tmp_path, {"source": pa.array([1, None]), "target": pa.array([2, 3])})
    with pytest.raises(BadRows, match=r"row 2: endorser \(column 'source'\) is empty"):
        read_links(path, OPTIONS)


NAME = st.one_of(st.none(), st.text(st.sampled_from("aé\0 "), max_size=3))


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(st.tuples(NAME, NAME, st.sampled_from([1.0, 2.5, 0.0, None, float("inf")])), min_size=1, max_size=8))
def test_rows_are_kept_by_the_rules_in_words(tmp_path, rows):
    sources, targets, weights = (list(column) for column in zip(*rows, strict=True))
    schema = pa.schema({"source": pa.string(), "target": pa.string(), "w": pa.float64()})
    path = put(tmp_path, pa.table([sources, targets, weights], schema=schema))
    good = [
        (source, target)
        for source, target, weight in rows
        if source and target and "\0" not in source + target and weight in (1.0, 2.5)
    ]
    options = ReadOptions(format="parquet", weight="w", bad_rows="drop")
    if good:
        assert links(read_links(path, options)) == good
    else:
        with pytest.raises(NoLinks):
            read_links(path, options)


def test_other_types_are_refused(tmp_path):
    path = put(tmp_path, {"source": [1.5], "target": ["a"], "list": [["a"]]})
    with pytest.raises(
        UnreadableFile, match=r"endorser \(column 'source'\) must hold text or integers, got type double"
    ):
        read_links(path, OPTIONS)
    with pytest.raises(UnreadableFile, match="must hold text or integers, got type list"):
        read_links(path, ReadOptions(format="parquet", endorser="target", endorsed="list"))
    other = put(tmp_path, {"source": ["b"], "target": ["a"], "w": ["1"]})
    with pytest.raises(UnreadableFile, match=r"weight \(column 'w'\) must hold numbers, got type string"):
        read_links(other, WEIGHTED)


def test_unusable_files(tmp_path):
    path = put(tmp_path, {"source": ["a"] * 999, "target": ["b"] * 999})
    with pytest.raises(MissingColumn, match=r"weight = 'w' \(no such column\)\. The file has 'source', 'target'"):
        read_links(path, WEIGHTED)
    content = path.read_bytes()
    for name, data in [("cut.parquet", content[:-20]), ("text.parquet", b"source,target\na,b\n")]:
        (tmp_path / name).write_bytes(data)
        with pytest.raises(UnreadableFile, match="expected a complete Parquet file"):
            read_links(tmp_path / name, OPTIONS)
    damaged = bytearray(content)
    damaged[4:40] = bytes(36)
    (tmp_path / "damaged.parquet").write_bytes(damaged)
    with pytest.raises(UnreadableFile, match=r"damaged\.parquet"):
        read_links(tmp_path / "damaged.parquet", OPTIONS)
    (tmp_path / "empty.parquet").write_bytes(b"")
    with pytest.raises(NoLinks, match="0 bytes"):
        read_links(tmp_path / "empty.parquet", OPTIONS)
    with pytest.raises(NoLinks, match="no link"):
        read_links(put(tmp_path, {"source": pa.array([], pa.string()), "target": pa.array([], pa.string())}), OPTIONS)
    (tmp_path / "links.parquet.gz").write_bytes(gzip.compress(content))
    with pytest.raises(UnreadableFile, match="Parquet compresses inside"):
        read_links(tmp_path / "links.parquet.gz", OPTIONS)
