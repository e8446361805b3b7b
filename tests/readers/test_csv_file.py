"""CSV and TSV: two roads give one truth; what is bad is named and nothing is lost."""

import csv
import gzip
import hashlib
import io
import re

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from swaygauge.errors import BadRows, ConfigError, MissingColumn, NoLinks, UnreadableFile
from swaygauge.readers import ReadOptions, read_links
from swaygauge.readers.csv_file import read_careful, read_fast
from swaygauge.readers.faults import NUMBER
from swaygauge.readers.options import problems

quick = settings(max_examples=300, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])


def links(raw):
    names = raw.names.to_pylist()
    return [(names[source], names[target]) for source, target in zip(raw.source_code, raw.target_code, strict=True)]


def put(tmp_path, content, name="links.csv"):
    path = tmp_path / name
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return path


def told(error):
    return str(error.value)


# --- what is read -----------------------------------------------------------------------------------------------------


def test_links_names_and_origin(tmp_path):
    path = put(tmp_path, "source,target\nb.example,a.example\na.example,c.example\n")
    raw = read_links(path, ReadOptions())
    assert links(raw) == [("b.example", "a.example"), ("a.example", "c.example")]
    assert raw.names.to_pylist() == ["a.example", "b.example", "c.example"]
    assert raw.weight is None
    assert raw.origin.file == "links.csv"
    assert raw.origin.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    assert (raw.origin.size, raw.origin.rows, raw.origin.dropped) == (path.stat().st_size, 2, ())


@pytest.mark.parametrize("ending", ["", ".gz", ".zst"])
@pytest.mark.parametrize("line_end", ["\n", "\r\n"])
def test_compressions_and_line_ends(tmp_path, ending, line_end):
    text = line_end.join(["fan\tidol\tw", "# a note", "a\tb\t0.5", "", "b\tc\t2e3"]).encode()
    packed = {"": bytes, ".gz": gzip.compress, ".zst": lambda data: pa.Codec("zstd").compress(data, asbytes=True)}
    path = put(tmp_path, packed[ending](text), f"x.tsv{ending}")
    options = ReadOptions(format="tsv", endorser="fan", endorsed="idol", weight="w", comment="#")
    raw = read_links(path, options)
    assert links(raw) == [("a", "b"), ("b", "c")]
    assert raw.weight is not None
    assert raw.weight.tolist() == [0.5, 2000.0]
    assert raw.origin.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()


def test_direction_is_written_by_role(tmp_path):
    path = put(tmp_path, "followed,day,follower\nstar,1,fan\n")
    assert links(read_links(path, ReadOptions(endorser="follower", endorsed="followed"))) == [("fan", "star")]


def test_columns_by_number_without_header(tmp_path):
    path = put(tmp_path, "1 2 7\n2 3 8\n")
    raw = read_links(path, ReadOptions(header=False, delimiter=" ", endorser=2, endorsed=1, weight=3))
    assert links(raw) == [("2", "1"), ("3", "2")]


STRANGE = [
    *(
        " a ",
        "A",
        "a",
        "na,me",
        'quo"te',
        '"',
        "tab\there",
        "new\nline",
        "\u202eevil",
        "\U0001f30a",
        "NA",
        "null",
        "nan",
    ),
    *("#tag", "=1+1", "\u00e9", "e\u0301", "\ufefffront", "١٢", "'", "\\", "\\n", "\x1b[31m", "\u2028", "x" * 2048),
]


@pytest.mark.parametrize("compact", [True, False])
def test_names_of_any_characters_stay_as_they_are(tmp_path, compact):
    rows = [(name, other) for name in STRANGE for other in STRANGE if name != other]
    text = io.StringIO()
    writer = csv.writer(text, quoting=csv.QUOTE_MINIMAL if compact else csv.QUOTE_ALL, lineterminator="\n")
    writer.writerows([("source", "target"), *rows])
    path = put(tmp_path, text.getvalue())
    assert links(read_links(path, ReadOptions())) == rows
    assert links(read_links(put(tmp_path, "\ufeff" + text.getvalue()), ReadOptions())) == rows


def test_a_mark_in_front_of_the_first_row_belongs_to_its_name(tmp_path):
    path = put(tmp_path, "source,target\n\ufeffa,b\n")
    assert links(read_links(path, ReadOptions())) == [("\ufeffa", "b")]


def test_without_quotes_a_quote_is_a_character(tmp_path):
    path = put(tmp_path, 'source\ttarget\n"a\tb"c\n')
    assert links(read_links(path, ReadOptions(format="tsv", quote=""))) == [('"a', 'b"c')]


# --- two roads, one truth ---------------------------------------------------------------------------------------------


def same(one, other):
    assert one.endorser.to_pylist() == other.endorser.to_pylist()
    assert one.endorsed.to_pylist() == other.endorsed.to_pylist()
    assert (one.weight is None) == (other.weight is None)
    if one.weight is not None:
        assert one.weight.tobytes() == other.weight.tobytes()
    assert one.sha256 == other.sha256
    assert one.size == other.size


ANY = st.characters(exclude_characters="\0", exclude_categories=["Cs"])
NAMES = st.one_of(st.sampled_from(STRANGE[:-1]), st.text(ANY, min_size=1, max_size=9))
WEIGHTS = st.one_of(
    st.floats(1e-300, 1e300).map(repr), st.sampled_from(["1", "+2", "3.", ".5", "1E5", "007", "1e-320"])
)


@quick
@given(
    rows=st.lists(st.tuples(NAMES, NAMES, WEIGHTS), min_size=1, max_size=30),
    line_end=st.sampled_from(["\n", "\r\n"]),
    quoting=st.sampled_from([csv.QUOTE_MINIMAL, csv.QUOTE_ALL]),
    block_size=st.sampled_from([8, 64, 1 << 20]),
)
def test_clean_files_read_the_same_on_both_roads(tmp_path, rows, line_end, quoting, block_size):
    # csv.writer of Python 3.11 leaves a lone carriage return unquoted: then the file states other rows
    assume(quoting == csv.QUOTE_ALL or not any("\r" in name for row in rows for name in row))
    text = io.StringIO()
    csv.writer(text, lineterminator=line_end, quoting=quoting).writerows([("source", "target", "w"), *rows])
    path = put(tmp_path, text.getvalue())
    options = ReadOptions(weight="w")
    careful = read_careful(path, options, block_size=block_size)
    assert list(zip(careful.endorser.to_pylist(), careful.endorsed.to_pylist(), strict=True)) == [
        row[:2] for row in rows
    ]
    assert careful.weight.tolist() == [float(row[2]) for row in rows]
    assert not careful.faults.total
    fast = read_fast(path, options)
    in_doubt = rows[0][0].startswith("\ufeff") or any("\r" in name for row in rows for name in row)
    assert (fast is None) <= in_doubt
    if fast is not None:
        same(fast, careful)


@quick
@given(
    text=st.text(st.sampled_from('ab,"\n\r#\0 1.-é\ufeff'), max_size=60),
    block_size=st.sampled_from([1, 8, 1 << 20]),
    weight=st.sampled_from(["", "w"]),
    comment=st.sampled_from(["", "#"]),
)
def test_any_text_is_decided_alike_by_all_roads(tmp_path, text, block_size, weight, comment):
    path = put(tmp_path, "source,target,w\n" + text)
    options = ReadOptions(weight=weight, comment=comment, max_name_bytes=5)
    fast = read_fast(path, options)
    whole = read_careful(path, options, block_size=1 << 20)
    blocks = read_careful(path, options, block_size=block_size)
    same(whole, blocks)
    assert (whole.faults.counts, whole.faults.samples) == (blocks.faults.counts, blocks.faults.samples)
    if fast is not None:
        same(fast, whole)
        assert not whole.faults.total
    if not comment:
        expected = rows_by_csv_alone(text, weighted=bool(weight), limit=5)
        assert list(zip(whole.endorser.to_pylist(), whole.endorsed.to_pylist(), strict=True)) == expected


def rows_by_csv_alone(text, *, weighted, limit):
    """The good rows, by Python's csv module over the whole text and the rules in words."""
    good = []
    reader = csv.reader(io.StringIO(text, newline=""), strict=True)
    while True:
        try:
            row = next(reader)
        except StopIteration:
            return good
        except csv.Error:
            continue
        if len(row) != 3 or any(not name or len(name.encode()) > limit or "\0" in name for name in row[:2]):
            continue
        if weighted:
            try:
                value = float(row[2])
            except ValueError:
                continue
            if row[2] != row[2].strip() or not 0 < value < float("inf"):
                continue
        good.append(tuple(row[:2]))


@quick
@given(st.text(st.sampled_from("0123456789.eE+-_ naifxINF\t１"), max_size=8))
def test_what_the_cast_takes_for_a_finite_number_the_rule_takes_too(text):
    # the fast road uses pyarrow's cast, the careful one a pattern and float(): same numbers
    try:
        value = pa.array([text]).cast(pa.float64())[0].as_py()
    except pa.ArrowInvalid:
        return
    if np.isfinite(value):
        assert NUMBER.fullmatch(text)
        assert float(text) == value


def test_a_bad_row_far_behind_is_named_by_its_line(tmp_path):
    rows = [f"n{at},n{at + 1}" for at in range(200_000)]
    rows[150_000] = "alone"
    path = put(tmp_path, "source,target\n" + "\n".join(rows))
    with pytest.raises(BadRows, match=re.escape("line 150002: expected 2 columns, got 1: 'alone'")):
        read_links(path, ReadOptions())
    raw = read_links(path, ReadOptions(bad_rows="drop"))
    del rows[150_000]
    assert links(raw) == [tuple(row.split(",")) for row in rows]
    assert raw.origin.rows == 200_000
    assert raw.origin.dropped == (("wrong number of columns", 1),)


def test_a_field_longer_than_csv_allows_is_a_bad_row_on_every_road(tmp_path):
    text = "source,target,text\na,b,short\n" + f"a,c,{'y' * 131_073}\n" + f"a,d,{'y' * 131_072}\n"
    path = put(tmp_path, text)
    assert read_fast(path, ReadOptions()) is None
    raw = read_links(path, ReadOptions(bad_rows="drop"))
    assert links(raw) == [("a", "b"), ("a", "d")]
    quoted = "source,target,text\na,b,short\n" + 'a,c,"' + 'y""\n' * 60_000 + '"\n' + "a,d,x\n"
    assert read_fast(put(tmp_path, quoted), ReadOptions()) is None


# --- what is refused --------------------------------------------------------------------------------------------------

BAD = [
    ("a", "wrong number of columns", "expected 3 columns, got 1: 'a'"),
    ("a,b,1,2", "wrong number of columns", "expected 3 columns, got 4: 'a,b,1,2'"),
    (",b,1", "empty name", "endorser (column 'source') is empty; expected a name"),
    ("a,,1", "empty name", "endorsed (column 'target') is empty; expected a name"),
    ("a,\0b,1", "NUL in name", "must not hold a NUL character, got '\\x00b'"),
    ("a,b,heavy", "weight not a number", "weight (column 'w') must be a finite number > 0, got 'heavy'"),
    ("a,b,", "weight not a number", "must be a finite number > 0, got ''"),
    ("a,b, 1", "weight not a number", "must be a finite number > 0, got ' 1'"),
    ("a,b,1_000", "weight not a number", "got '1_000'"),
    ('a,b,"1,5"', "weight not a number", "got '1,5'"),
    ("a,b,0x10", "weight not a number", "got '0x10'"),
    ("a,b,１", "weight not a number", "got '１'"),
    ("a,b,NaN", "weight not finite", "got 'NaN'"),
    ("a,b,-inf", "weight not finite", "got '-inf'"),
    ("a,b,1e999", "weight not finite", "got '1e999'"),
    ("a,b,-2", "weight not above zero", "must be a finite number > 0, got '-2'"),
    ("a,b,0", "weight not above zero", "got '0'"),
    ("a,b,1e-999", "weight not above zero", "got '1e-999'"),
    ('"a"x,b,1', "broken quoting", "expected after"),
    (
        "x" * 10_000 + ",b,1",
        "name too long",
        "endorser (column 'source') is 10,000 bytes long, at most 2,048 are allowed",
    ),
    ("é" * 1025 + ",b,1", "name too long", "is 2,050 bytes long"),
]


@pytest.mark.parametrize(("row", "reason", "sentence"), BAD, ids=[row[:12] for row, *_ in BAD])
def test_bad_rows_are_refused_by_line_or_dropped_and_counted(tmp_path, row, reason, sentence):
    path = put(tmp_path, f"source,target,w\nu,v,1\n{row}\nv,u,2\n")
    before = path.read_bytes()
    with pytest.raises(BadRows) as error:
        read_links(path, ReadOptions(weight="w"))
    assert told(error).startswith("links.csv: 1 row(s) cannot be used; ")
    assert error.value.problems[0].startswith("line 3: ")
    assert sentence in error.value.problems[0]
    assert "bad_rows = 'drop'" in told(error)
    raw = read_links(path, ReadOptions(weight="w", bad_rows="drop"))
    assert links(raw) == [("u", "v"), ("v", "u")]
    assert raw.weight.tolist() == [1.0, 2.0]
    assert raw.origin.dropped == ((reason, 1),)
    assert raw.origin.rows == 3
    assert len(told(error)) < 700
    assert path.read_bytes() == before


def test_a_name_that_is_not_utf8(tmp_path):
    path = put(tmp_path, b"source,target,note\na,b,\xff\ncaf\xe9,b,x\n")
    with pytest.raises(BadRows, match=re.escape(r"line 3: endorser (column 'source') must be UTF-8, got 'caf\xe9'")):
        read_links(path, ReadOptions())
    # a column that is not read may hold anything
    assert links(read_links(path, ReadOptions(bad_rows="drop"))) == [("a", "b")]


def test_all_bad_rows_are_counted_and_a_hundred_described(tmp_path):
    path = put(tmp_path, "source,target\na,b\n" + "alone\n" * 150)
    with pytest.raises(BadRows) as error:
        read_links(path, ReadOptions())
    assert error.value.count == 150
    assert len(error.value.problems) == 100
    assert "... and 130 more" in told(error)


def test_an_open_quote_loses_no_line_uncounted(tmp_path):
    path = put(tmp_path, 'source,target\na,b\n"c,d\ne,f\ng,h\n')
    with pytest.raises(BadRows) as error:
        read_links(path, ReadOptions())
    assert error.value.problems[0].startswith("lines 3 to 5: ")
    assert error.value.count == 3
    assert read_links(path, ReadOptions(bad_rows="drop")).origin.rows == 4


def test_a_comment_line_without_the_setting_is_a_bad_row_that_says_so(tmp_path):
    path = put(tmp_path, "source,target\na,b\n# checked\n")
    with pytest.raises(BadRows, match=re.escape("set reader.comment = '#'")):
        read_links(path, ReadOptions())
    assert links(read_links(path, ReadOptions(comment="#"))) == [("a", "b")]


@pytest.mark.parametrize("content", ["", "source,target\n", "source,target", "# nothing\n#\n", "\n\n"])
def test_no_links(tmp_path, content):
    with pytest.raises(NoLinks, match=r"links\.csv"):
        read_links(put(tmp_path, content), ReadOptions(comment="#"))


def test_no_link_left_after_dropping_says_why(tmp_path):
    path = put(tmp_path, "source,target\n,b\n")
    with pytest.raises(NoLinks, match=r"line 2: endorser .* is empty"):
        read_links(path, ReadOptions(bad_rows="drop"))


def test_missing_columns_are_all_named_with_those_there_are(tmp_path):
    path = put(tmp_path, "from,to,to\na,b,c\n")
    with pytest.raises(MissingColumn) as error:
        read_links(path, ReadOptions(endorsed="to", weight="w"))
    for part in (
        "endorser = 'source' (no such column)",
        "endorsed = 'to' (2 columns",
        "weight = 'w'",
        "'from', 'to', 'to'",
    ):
        assert part in told(error)
    with pytest.raises(MissingColumn, match=r"endorsed = 4 \(no such column number\)"):
        read_links(path, ReadOptions(header=False, endorser=1, endorsed=4))


def test_damaged_and_misnamed_files(tmp_path):
    text = b"source,target\n" + b"".join(b"%d,%d\n" % (at, at + 1) for at in range(50_000))
    packed = gzip.compress(text)
    squeezed = pa.Codec("zstd").compress(text, asbytes=True)
    for name, content, words in [
        ("cut.csv.gz", packed[: len(packed) // 2], "complete gzip data"),
        ("cut.csv.gz", packed[:-1], "complete gzip data"),
        ("sum.csv.gz", packed[:-8] + b"\0\0\0\0" + packed[-4:], "complete gzip data"),
        ("cut.csv.zst", squeezed[: len(squeezed) // 2], "complete zstd data"),
        ("plain.csv.gz", text, "promises gzip compression, its first bytes show no compression"),
        ("packed.csv", packed, "promises no compression, its first bytes show gzip compression"),
        ("other.csv.gz", squeezed, "promises gzip compression, its first bytes show zstd compression"),
        ("wide.csv", text.decode().encode("utf-16"), "UTF-16"),
    ]:
        with pytest.raises(UnreadableFile, match=words) as error:
            read_links(put(tmp_path, content, name), ReadOptions())
        assert told(error).startswith(name)
    assert len(read_links(put(tmp_path, packed + gzip.compress(b"x,y\n"), "two.csv.gz"), ReadOptions()).names) == 50_003
    with pytest.raises(UnreadableFile, match="is a folder"):
        read_links(tmp_path, ReadOptions())
    with pytest.raises(UnreadableFile, match="no such file"):
        read_links(tmp_path / "nowhere.csv", ReadOptions())


def test_contradicting_options_are_reported_together(tmp_path):
    options = ReadOptions(
        header=False, endorser="a", endorsed=0, weight="w", duplicates="count", quote=",", comment='"'
    )
    assert [problem.split(":")[0] for problem in problems(options)] == [
        "endorser",
        "endorsed",
        "weight",
        "duplicates",
        "quote",
    ]
    with pytest.raises(ConfigError, match="5 settings"):
        read_links(tmp_path / "any.csv", options)
    assert problems(ReadOptions()) == []
    assert problems(ReadOptions(endorser="x", endorsed="x"))
    assert problems(ReadOptions(delimiter="::"))
    assert problems(ReadOptions(comment=",x"))


def test_a_first_row_that_cannot_be_followed(tmp_path):
    with pytest.raises(UnreadableFile, match=r"links\.csv, line 1: .*Correct the quotes of the first row"):
        read_links(put(tmp_path, '"source"x,target\na,b\n'), ReadOptions())


def test_any_number_of_comment_lines_in_front(tmp_path):
    path = put(tmp_path, "# a long licence\n" * 150_000 + "source,target\na,b\nc\n")
    raw = read_links(path, ReadOptions(comment="#", bad_rows="drop"))
    assert links(raw) == [("a", "b")]
    assert raw.origin.dropped_samples == ("line 150003: expected 2 columns, got 1: 'c'",)


def test_the_last_row_needs_no_line_end_and_may_end_in_an_open_quote(tmp_path):
    assert links(read_links(put(tmp_path, 'source,target\n"a",b\nc,"d"'), ReadOptions())) == [("a", "b"), ("c", "d")]
    with pytest.raises(BadRows, match="line 3: unexpected end of data"):
        read_links(put(tmp_path, 'source,target\n"a",b\nc,"d'), ReadOptions())
