from __future__ import annotations

import subprocess
import sys
from datetime import date

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from swaygauge.errors import Damaged, NotInStore, StoreError
from swaygauge.store import Reader, Store, queries
from swaygauge.store import names as names_module
from swaygauge.store.checkup import checkup

NIGHT = date(2031, 3, 1)
HOSTILE = [
    "",
    " ",
    "a",
    "A",
    "o'hara\"; DROP TABLE part; --",
    "line\nbreak\r\n\ttab",
    "nul\0inside",
    "\x1b[31mred",
    "\u202egnp.exe",
    "<img src=x onerror=alert(1)>",
    "=1+1",
    "%s %(x)s :name $1 ?",
    "e\u0301",
    "\u00e9",
    "\U0001f6a2" * 3,
    "x" * 10_240,
    "NULL",
    "null",
    "nan",
    "../../etc",
]


def test_ids_are_positions_in_the_order_given(store):
    table = store.names("net")
    assert table.intern(["b", "a", "b", "c"], night=NIGHT).tolist() == [0, 1, 0, 2]
    assert table.intern(pa.array(["d", "a", "d"]), night=date(2031, 3, 2)).tolist() == [3, 1, 3]
    assert table.intern(pa.chunked_array([["a"], ["e"]]), night=date(2031, 3, 3)).tolist() == [1, 4]
    assert len(table) == 5
    assert table.texts([4, 0]) == ["e", "b"]
    assert table.lookup(["c", "never", ""]).tolist() == [2, -1, -1]
    assert table.lookup([]).tolist() == []
    days = [date.fromordinal(day) for day in table.first_seen(np.arange(5, dtype=np.int32)).tolist()]
    assert days == [NIGHT, NIGHT, NIGHT, date(2031, 3, 2), date(2031, 3, 3)]
    assert table.lookup(["a"]).dtype == table.first_seen(np.zeros(1, np.int32)).dtype == np.int32


def test_hostile_names_come_back_exactly(store):
    ids = store.names("net").intern(HOSTILE, night=NIGHT)
    assert ids.tolist() == list(range(len(HOSTILE)))
    with Store.open(store.workspace) as again, Reader.open(store.workspace) as reader:
        assert again.names("net").texts(ids) == HOSTILE
        assert again.names("net").lookup(HOSTILE).tolist() == ids.tolist()
        assert list(reader.names("net", ids.tolist()).values()) == HOSTILE
        for node, name in enumerate(HOSTILE):
            found = reader.find_node("net", name)
            assert [(match.node, match.name, match.how) for match in found] == [(node, name, "name")]
            assert found[0].first_seen == NIGHT


@settings(max_examples=25, deadline=None)
@given(st.lists(st.lists(st.text(max_size=6), max_size=12), max_size=24))
def test_any_order_of_batches_is_a_dictionary(tmp_path_factory, batches):
    """The table does what a dict does, over many small parts and merges, for two objects that take turns."""
    workspace = tmp_path_factory.mktemp("names")
    truth: dict[str, int] = {}
    with Store.open(workspace) as first, Store.open(workspace) as second:
        for turn, batch in enumerate(batches):
            table = (first, second)[turn % 2].names("net")
            ids = table.intern(batch, night=NIGHT)
            for name in batch:
                truth.setdefault(name, len(truth))
            assert ids.tolist() == [truth[name] for name in batch]
        for opened in (first, second):
            assert opened.names("net").lookup(list(truth)).tolist() == list(truth.values())
        assert checkup(first, "net") == [] or all(f.level == "note" for f in checkup(first, "net"))


def test_small_parts_are_merged_and_the_large_one_stays(store):
    table = store.names("net")
    table.intern([f"old-{n}" for n in range(5_000)], night=NIGHT)
    large = queries.name_parts(store.catalog.ask, "net")[0]
    for turn in range(60):
        table.intern([f"new-{turn}-{n}" for n in range(7)], night=date.fromordinal(NIGHT.toordinal() + turn))
        parts = queries.name_parts(store.catalog.ask, "net")
        assert len(parts) <= names_module.MOST_PARTS
        assert parts[0] == large
    with Store.open(store.workspace) as again:
        assert again.names("net").texts([5_000, 5_419]) == ["new-0-0", "new-59-6"]
        assert again.names("net").first_seen(np.array([4_999, 5_000, 5_419])).tolist() == [
            NIGHT.toordinal(),
            NIGHT.toordinal(),
            NIGHT.toordinal() + 59,
        ]
    assert [finding.level for finding in checkup(store, "net")] == ["note"]  # the files that were merged


def test_repeating_an_intern_writes_nothing(store):
    store.names("net").intern(["a", "b"], night=NIGHT)
    before = queries.name_parts(store.catalog.ask, "net")
    store.names("net").intern(["b", "a"], night=date(2031, 4, 1))
    assert queries.name_parts(store.catalog.ask, "net") == before


def test_a_failed_commit_leaves_no_name_behind(store, monkeypatch):
    table = store.names("net")
    table.intern(["a"], night=NIGHT)

    def fail(*_):
        raise OSError("disk full")

    with monkeypatch.context() as patch:
        patch.setattr(names_module, "insert_rows", fail)
        with pytest.raises(OSError, match="disk full"):
            table.intern(["a", "b"], night=NIGHT)
    assert table.lookup(["a", "b"]).tolist() == [0, -1]
    assert table.intern(["c", "b"], night=NIGHT).tolist() == [1, 2]


INTERN = """
import sys
from datetime import date
from pathlib import Path
from swaygauge.store import Store
with Store.open(Path(sys.argv[1])) as store:
    table = store.names("net")
    for turn in range(40):
        names = [f"shared-{turn}-{n}" for n in range(5)] + [f"own-{sys.argv[2]}-{turn}-{n}" for n in range(5)]
        ids = table.intern(names, night=date(2031, 3, 1))
        assert table.texts(ids) == names
"""


def test_two_processes_never_give_one_id_twice(tmp_path):
    processes = [subprocess.Popen([sys.executable, "-c", INTERN, str(tmp_path), who]) for who in ("x", "y")]
    assert [process.wait(timeout=120) for process in processes] == [0, 0]
    with Store.open(tmp_path) as store:
        table = store.names("net")
        assert len(table) == 40 * 5 * 3
        assert len(set(table.texts(range(len(table))))) == len(table)
        assert {finding.level for finding in checkup(store, "net")} <= {"note"}


@pytest.mark.parametrize("bad", [["a", None], [1, 2], ["\ud800"], [b"\xff"]])
def test_what_is_no_text_is_refused_and_nothing_is_kept(store, bad):
    with pytest.raises(StoreError):
        store.names("net").intern(bad, night=NIGHT)
    assert len(store.names("net")) == 0


def test_unknown_ids_and_damage_are_told(store):
    table = store.names("net")
    table.intern(["a"], night=NIGHT)
    for ids in ([1], [-1]):
        with pytest.raises(NotInStore, match="0 to 0"):
            table.texts(ids)
    path = store.workspace / queries.name_parts(store.catalog.ask, "net")[0].path
    path.write_bytes(path.read_bytes()[:-1] + b"X")
    with Store.open(store.workspace) as again, pytest.raises(Damaged, match="names from id 0"):
        again.names("net").lookup(["a"])
