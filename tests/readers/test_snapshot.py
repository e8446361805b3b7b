"""The night's distinct links: one order, whatever the order of rows was."""

from datetime import date
from fractions import Fraction

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from swaygauge.errors import BadRows, NoLinks
from swaygauge.readers.faults import Faults
from swaygauge.readers.raw import Rows, encode
from swaygauge.readers.snapshot import make_snapshot
from swaygauge.records import Origin

NIGHT = date(2025, 3, 9)
ORIGIN = Origin("links.csv", "", 0, "csv", 0)


def raw_links(rows, weights=None):
    source, target = zip(*rows, strict=True)
    weight = None if weights is None else np.array(weights, float)
    return encode(Rows(pa.chunked_array([source]), pa.chunked_array([target]), weight, Faults(), "", 0), ORIGIN)


def snap(rows, weights=None, **how):
    raw = raw_links(rows, weights)
    return make_snapshot(NIGHT, raw, ids=np.arange(len(raw.names), dtype=np.int32), **how)


ROWS = st.lists(st.tuples(st.sampled_from("abcd"), st.sampled_from("abcd")), min_size=1, max_size=40)


@settings(deadline=None)
@given(rows=ROWS, keep=st.booleans(), data=st.data())
def test_against_plain_python_and_any_order_gives_the_same_bytes(rows, keep, data):
    weights = data.draw(st.lists(st.floats(1e-9, 1e9), min_size=len(rows), max_size=len(rows)))
    links = sorted({(target, source) for source, target in rows if keep or source != target})
    how = {"self_links": "keep" if keep else "leave_out"}
    if not links:
        with pytest.raises(NoLinks, match="self_links = 'keep'"):
            snap(rows, weights, **how)
        return
    order = data.draw(st.permutations(range(len(rows))))
    shuffled = [rows[at] for at in order]
    for weighted in (False, True):
        one = snap(rows, weights if weighted else None, **how)
        other = snap(shuffled, [weights[at] for at in order] if weighted else None, **how)
        names = raw_links(rows).names.to_pylist()
        got = [(names[target], names[source]) for source, target in zip(one.source, one.target, strict=True)]
        assert got == links
        loops = len({row for row in rows if row[0] == row[1]})
        assert one.self_links == loops
        assert len(links) + one.duplicates + (0 if keep else loops) == len(rows)
        for field in ("source", "target", "weight"):
            first, second = getattr(one, field), getattr(other, field)
            assert (first is None) == (second is None)
            if first is not None:
                assert first.tobytes() == second.tobytes()
                assert not first.flags.writeable
        if weighted:
            exact = [
                float(
                    sum(Fraction(weight) for row, weight in zip(rows, weights, strict=True) if row == (source, target))
                )
                for target, source in links
            ]
            np.testing.assert_allclose(one.weight, exact, rtol=1e-14)


def test_ids_are_given_from_outside_and_may_be_shared():
    raw = raw_links([("a", "b"), ("c", "b"), ("b", "a")])
    snapshot = make_snapshot(NIGHT, raw, ids=np.array([40, 7, 40], np.int32), fetched=np.array([40, 7, 40], np.int32))
    np.testing.assert_array_equal(snapshot.source, [40, 7])
    np.testing.assert_array_equal(snapshot.target, [7, 40])
    assert snapshot.source.dtype == snapshot.target.dtype == np.int32
    assert snapshot.duplicates == 1
    np.testing.assert_array_equal(snapshot.fetched, [7, 40])


def test_large_ids_keep_their_order():
    raw = raw_links([("a", "b"), ("b", "a"), ("c", "a")])
    top = np.iinfo(np.int32).max
    snapshot = make_snapshot(NIGHT, raw, ids=np.array([top, 0, top - 1], np.int32))
    assert list(zip(snapshot.target, snapshot.source, strict=True)) == [(0, top), (top, 0), (top, top - 1)]


def test_weights_that_overflow_when_added():
    with pytest.raises(BadRows, match=r"the link 'a' -> 'b' add up to more"):
        snap([("b", "a"), ("a", "b"), ("a", "b")], [1.0, 1e308, 1e308])
