"""Renames and merges over time."""

from datetime import date, timedelta

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from swaygauge.errors import BadRows, MissingColumn
from swaygauge.readers import ReadOptions, read_links
from swaygauge.readers.aliases import Alias, Resolved, apply_aliases, mistakes, read_aliases, resolve


def day(number):
    return date(2025, 3, number)


def table(*lines):
    return [Alias(old, new, day(number), line) for line, (old, new, number) in enumerate(lines, start=2)]


def put(tmp_path, text):
    path = tmp_path / "aliases.csv"
    path.write_text(text, encoding="utf-8")
    return path


def test_a_rename_takes_over_the_history_from_its_night_on():
    aliases, seen = table(("a", "b", 9)), {"a": day(1)}.get
    assert resolve(aliases, day(8), first_seen=seen) == Resolved({}, {})
    for night in (day(9), day(30)):
        assert resolve(aliases, night, first_seen=seen) == Resolved({"b": "a"}, {"a": "b"})
    # b itself is first seen on the very night, or later: still the rename
    assert resolve(aliases, day(9), first_seen={"a": day(1), "b": day(9)}.get).canonical == {"b": "a"}


def test_a_merge_goes_into_the_name_that_was_known():
    found = resolve(table(("a", "b", 9)), day(9), first_seen={"a": day(1), "b": day(8)}.get)
    assert found == Resolved({"a": "b"}, {})


def test_chains_resolve_also_within_one_date_and_in_any_order_of_lines():
    seen = {"a": day(1)}.get
    later = resolve(table(("b", "c", 20), ("a", "b", 9)), day(20), first_seen=seen)
    assert later == Resolved({"b": "a", "c": "a"}, {"a": "c"})
    assert resolve(table(("b", "c", 20), ("a", "b", 9)), day(19), first_seen=seen) == Resolved({"b": "a"}, {"a": "b"})
    assert resolve(table(("c", "d", 9), ("b", "c", 9), ("a", "b", 9)), day(9), first_seen=seen) == Resolved(
        {"b": "a", "c": "a", "d": "a"}, {"a": "d"}
    )


def test_two_old_names_for_one_unseen_new_name():
    seen = {"a": day(1), "b": day(1)}.get
    assert resolve(table(("a", "c", 9), ("b", "c", 9)), day(9), first_seen=seen) == Resolved(
        {"c": "a", "b": "a"}, {"a": "c"}
    )
    assert resolve(table(("b", "c", 9), ("a", "c", 9)), day(9), first_seen=seen).canonical == {"c": "b", "a": "b"}
    # the earlier date is first, whatever the order of lines
    assert resolve(table(("b", "c", 10), ("a", "c", 9)), day(10), first_seen=seen).canonical == {"c": "a", "b": "a"}


def test_a_renamed_node_that_merges_takes_its_names_along():
    found = resolve(table(("a", "b", 9), ("b", "z", 20)), day(20), first_seen={"a": day(1), "z": day(2)}.get)
    assert found == Resolved({"b": "z", "a": "z"}, {})


def test_a_name_given_back_changes_what_is_shown():
    aliases, seen = table(("a", "b", 9), ("b", "a", 20)), {"a": day(1)}.get
    assert resolve(aliases, day(19), first_seen=seen) == Resolved({"b": "a"}, {"a": "b"})
    assert resolve(aliases, day(20), first_seen=seen) == Resolved({"b": "a"}, {"a": "a"})
    assert mistakes(aliases) == []


NAMES = st.sampled_from("abcdef")


@settings(max_examples=300, deadline=None)
@given(
    st.lists(st.tuples(NAMES, NAMES, st.integers(2, 6)), max_size=7),
    st.dictionaries(NAMES, st.integers(1, 7).map(day)),
    st.randoms(use_true_random=False),
)
def test_for_any_table_without_mistakes(lines, seen, random):
    aliases = table(*lines)
    if mistakes(aliases):
        return
    shuffled = aliases.copy()
    random.shuffle(shuffled)
    for number in range(1, 8):
        found = resolve(aliases, day(number), first_seen=seen.get)
        # the order in which the lines are handed over does not matter, nor what comes to be seen later
        assert found == resolve(shuffled, day(number), first_seen=seen.get)
        known = {name: night for name, night in seen.items() if night < day(number)}
        assert found == resolve(aliases, day(number), first_seen=known.get)
        # canonical names are final, and names are one exactly if lines up to the night join them
        assert not set(found.canonical.values()) & set(found.canonical)
        groups = {name: {name} for name in "abcdef"}
        for alias in aliases:
            if alias.valid_from <= day(number):
                joined = groups[alias.old] | groups[alias.new]
                groups.update(dict.fromkeys(joined, joined))
        for name, group in groups.items():
            assert {other for other in "abcdef" if canonical(found, other) == canonical(found, name)} == group
        assert set(found.shown) <= {canonical(found, name) for name in "abcdef"}


def canonical(found, name):
    return found.canonical.get(name, name)


def test_reading_with_comments_and_quotes(tmp_path):
    path = put(tmp_path, '# ours\nold,new,valid_from\na,"b, c",2025-03-09\n\n# more\n"#x",y,2025-03-10\n')
    assert read_aliases(path) == (Alias("a", "b, c", day(9), 3), Alias("#x", "y", day(10), 6))
    assert read_aliases(put(tmp_path, "")) == ()
    assert read_aliases(put(tmp_path, "old,new,valid_from\n")) == ()
    hosts = put(tmp_path, "old,new,valid_from\nA.example.,b.example:80,2025-03-09\n")
    assert read_aliases(hosts, normalise=True) == (Alias("a.example", "b.example", day(9), 2),)


def test_every_mistake_is_reported_at_once(tmp_path):
    path = put(
        tmp_path,
        "old,new,valid_from\n"
        "a,b\n"  # 2
        ",b,2025-03-09\n"  # 3
        "a,b,2025-02-30\n"  # 4
        "a,b,20250309\n"  # 5
        "c,c,2025-03-09\n"  # 6
        "d,e,2025-03-09\n"  # 7
        "d,f,2025-03-09\n"  # 8: two new names on one date
        "d,e,2025-03-10\n"  # 9: as line 7
        "x,y,2025-03-11\n"  # 10, 11, 12: a circle; 13 only leads into it
        "y,z,2025-03-11\n"
        "z,x,2025-03-11\n"
        "w,x,2025-03-11\n",
    )
    with pytest.raises(BadRows) as error:
        read_aliases(path)
    told = error.value.problems
    assert [problem.split(":")[0] for problem in told] == [f"line {line}" for line in (2, 3, 4, 5, 6, 8, 9, 10, 11, 12)]
    for line, words in zip(
        told,
        ["expected 3 columns", "old is empty", "got '2025-02-30'", "got '20250309'", "must differ", "on line 7",
         "since 2025-03-09 already, by line 7", "leads back", "leads back", "leads back"],
        strict=True,
    ):  # fmt: skip
        assert words in line
    assert "bad_rows" not in str(error.value)
    with pytest.raises(MissingColumn, match="first row must be 'old,new,valid_from', got 'a,b,c'"):
        read_aliases(put(tmp_path, "a,b,c\n"))


def test_the_same_rename_again_after_it_was_taken_back_is_no_mistake():
    assert mistakes(table(("a", "b", 9), ("b", "a", 12), ("a", "b", 15))) == []
    assert len(mistakes(table(("a", "b", 9), ("a", "b", 15), ("b", "a", 20)))) == 1


def test_links_under_canonical_names(tmp_path):
    path = tmp_path / "links.csv"
    path.write_text("source,target\nfan,new\nold,fan\nnew,other\n", encoding="utf-8")
    raw = read_links(path, ReadOptions())
    found = resolve(table(("old", "new", 9)), day(9), first_seen={"old": day(1)}.get)
    after = apply_aliases(raw, found)
    assert after.names.to_pylist() == ["fan", "old", "other"]
    np.testing.assert_array_equal(after.source_code, [0, 1, 1])
    np.testing.assert_array_equal(after.target_code, [1, 0, 2])
    assert after.origin.aliased == 1
    assert apply_aliases(raw, Resolved({}, {})) is raw
    assert day(9) - timedelta(1) == day(8)
