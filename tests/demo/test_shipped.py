"""The shipped files: they are what the generator writes, and they hold what their truth says."""

from __future__ import annotations

import csv
import functools
import gzip
import hashlib
import itertools
import json
from datetime import date, timedelta
from pathlib import Path
from typing import Any

import make_demo
import numpy as np
import pytest
from islands.scoring import spectral_radius

DEMO = Path(__file__).parents[2] / "demo_data"
OSTREL, TIDEMARK = DEMO / "ostrel", DEMO / "tidemark"


def content(path: Path) -> bytes:
    """What is in a file: compressed bytes may differ between versions of zlib, the content may not."""
    data = path.read_bytes()
    return gzip.decompress(data) if path.suffix == ".gz" else data


def digests(folder: Path) -> dict[str, str]:
    return {
        path.relative_to(folder).as_posix(): hashlib.sha256(content(path)).hexdigest()
        for path in sorted(folder.rglob("*"))
        if path.is_file() and not path.name.startswith(".")
    }


def night_file(night: str) -> Path:
    path = OSTREL / f"links-{night}.csv.gz"
    return path if path.exists() else OSTREL / "late" / path.name


@functools.lru_cache(maxsize=12)
def links(night: str) -> set[tuple[str, str]]:
    rows = list(csv.reader(content(night_file(night)).decode().splitlines()))
    assert rows[0] == ["from_site", "to_site"]
    found = {(source, target) for source, target in rows[1:]}
    assert len(found) == len(rows) - 1
    return found


def before(night: str, nights: int = 1) -> str:
    return (date.fromisoformat(night) - timedelta(days=nights)).isoformat()


@pytest.fixture(scope="module")
def truth() -> dict[str, Any]:
    loaded: dict[str, Any] = json.loads((OSTREL / "truth.json").read_text(encoding="utf-8"))
    return loaded


@pytest.fixture(scope="module")
def events(truth: dict[str, Any]) -> dict[str, dict[str, Any]]:
    return {event["event"]: event for event in truth["events"]}


def fault(truth: dict[str, Any], name: str) -> dict[str, Any]:
    return next(entry for entry in truth["faults"] if entry["fault"] == name)


def test_shipped_ostrel_is_what_the_generator_writes(tmp_path: Path) -> None:
    make_demo.write_ostrel(tmp_path / "ostrel")
    assert digests(tmp_path / "ostrel") == digests(OSTREL)


def test_shipped_tidemark_is_what_the_generator_writes_and_twice_gives_the_same_bytes(tmp_path: Path) -> None:
    for folder in ("one", "two"):
        make_demo.write_tidemark(tmp_path / folder)
    assert digests(tmp_path / "one") == digests(TIDEMARK)
    for path in (tmp_path / "one").iterdir():
        assert path.read_bytes() == (tmp_path / "two" / path.name).read_bytes()


def test_total_size_stays_below_eight_megabytes() -> None:
    assert sum(path.stat().st_size for part in (OSTREL, TIDEMARK) for path in part.rglob("*.*")) < 8e6


def test_every_event_that_was_asked_for_is_there(events: dict[str, dict[str, Any]]) -> None:
    expected = {
        "slow drip": "drift",
        "news": "surge",
        "hub drop": "swing",
        "rename": "",
        "dense ring": "lambda jump",
        "departure": "departure",
        "hub link": "swing",
        "fresh farm": "surge",
    }
    assert {name: event["expected"] for name, event in events.items()} == expected


def test_planted_links_are_in_the_file_of_their_night_and_in_none_before(events: dict[str, dict[str, Any]]) -> None:
    for name, event in events.items():
        if name == "slow drip":
            continue
        added = {tuple(pair) for pair in event["added"]}
        assert added <= links(event["night"]), name
        for nights in (1, 2, 3):
            if night_file(before(event["night"], nights)).exists():
                assert not added & links(before(event["night"], nights)), name


def test_removed_links_were_there_and_are_gone(events: dict[str, dict[str, Any]]) -> None:
    for name, event in events.items():
        removed = {tuple(pair) for pair in event["removed"]}
        assert not removed & links(event["night"]), name
        lately: set[tuple[str, str]] = set().union(*(links(before(event["night"], nights)) for nights in (1, 2)))
        assert len(removed & lately) >= 0.98 * len(removed), name  # the crawl may have missed some on both nights


def test_the_drip_adds_two_fresh_sources_a_night_for_fifteen_nights(events: dict[str, dict[str, Any]]) -> None:
    drip = events["slow drip"]
    target, seen = drip["nodes"][0], set()
    course = drip["course"]
    assert [entry["sources_so_far"] for entry in course] == list(range(2, 31, 2))
    for entry in course:
        if night_file(entry["night"]).exists():
            now = {source for source, end in links(entry["night"]) if end == target and source in drip["sources"]}
            seen |= now
            assert len(now) <= entry["sources_so_far"]
    assert seen == set(drip["sources"])
    first = before(drip["night"])
    assert not {source for source, _ in links(first)} & set(drip["sources"])
    # no night alone is a jump: the places between two nights stay within a factor of 1.5
    places = [entry["fairshare"][1] for entry in course]
    assert max(a / b for a, b in itertools.pairwise(places)) < 1.5
    assert drip["material_from"] is not None


def test_fresh_sources_are_fresh_and_news_sources_are_not(events: dict[str, dict[str, Any]]) -> None:
    for name, known in (("fresh farm", 0), ("news", 25)):
        event = events[name]
        earlier = links(before(event["night"]))
        names = {end for pair in earlier for end in pair}
        assert len(names & set(event["sources"])) == known, name
    assert len(events["fresh farm"]["sources"]) == 50
    assert events["fresh farm"]["night"] == "2031-04-14"


def test_the_missing_night_is_missing_and_the_late_file_waits(truth: dict[str, Any]) -> None:
    missing, late = (fault(truth, name)["night"] for name in ("missing night", "late file"))
    assert not night_file(missing).exists()
    assert (OSTREL / "late" / f"links-{late}.csv.gz").exists()
    assert not (OSTREL / f"links-{late}.csv.gz").exists()
    assert len(list(OSTREL.glob("links-*.csv.gz"))) == 43
    assert len(list((OSTREL / "late").iterdir())) == 1


def test_the_partial_night_lost_the_stated_share_of_sources(truth: dict[str, Any]) -> None:
    entry = fault(truth, "partial crawl")
    sources = [{source for source, _ in links(night)} for night in (before(entry["night"]), entry["night"])]
    lost = len(sources[0] - sources[1]) / len(sources[0])
    assert lost == pytest.approx(entry["sources_missing"], abs=0.02)
    assert 0.30 < lost < 0.40


def test_the_capped_night_has_no_list_longer_than_the_cap(truth: dict[str, Any]) -> None:
    entry = fault(truth, "capped lists")

    def lengths(night: str) -> dict[str, int]:
        counts: dict[str, int] = {}
        for source, _ in links(night):
            counts[source] = counts.get(source, 0) + 1
        return counts

    now, earlier = lengths(entry["night"]), lengths(before(entry["night"]))
    assert max(now.values()) == entry["cap"]
    cut = [source for source, count in earlier.items() if count > entry["cap"] and now.get(source) == entry["cap"]]
    assert len(cut) >= 5
    assert abs(len(cut) - entry["cut"]) <= 2


def test_the_rename_moves_the_links_and_its_alias_is_shipped(events: dict[str, dict[str, Any]]) -> None:
    event = events["rename"]
    old, new = event["nodes"]
    rows = list(csv.reader((OSTREL / "aliases.csv").read_text().splitlines()))
    assert rows == [["old", "new", "valid_from"], [old, new, event["night"]]]
    moved = {tuple(new if end == old else end for end in pair) for pair in event["removed"]}
    assert moved == {tuple(pair) for pair in event["added"]}
    assert not any(old in pair for pair in links(event["night"]))
    assert len([pair for pair in event["added"] if pair[1] == new]) >= 5


def test_the_ring_lifts_lambda_of_the_file_by_more_than_four_percent(events: dict[str, dict[str, Any]]) -> None:
    event = events["dense ring"]
    now = links(event["night"])
    without = now - {tuple(pair) for pair in event["added"]}
    number = {name: i for i, name in enumerate(sorted({end for pair in now for end in pair}))}

    def radius(pairs: set[tuple[str, ...]]) -> float:
        n = len(number)
        return spectral_radius(np.sort(np.array([number[u] * n + number[v] for u, v in pairs])), n)

    lift = radius(now) / radius(without)
    assert lift > 1.04
    assert lift == pytest.approx(event["lambda_with"] / event["lambda_without"], rel=0.01)
    # alpha = .80 / lambda of the first night stays usable: alpha x lambda keeps below the .90 of a new era
    first = json.loads((OSTREL / "truth.json").read_text(encoding="utf-8"))["alpha_katz"]
    assert first * event["lambda_with"] < 0.90


def test_planted_effects_are_material(events: dict[str, dict[str, Any]]) -> None:
    """At least 1.5x in places in one score, in the stated direction."""
    for name in ("news", "fresh farm", "hub drop", "hub link"):
        best = max(events[name]["effect"], key=lambda effect: abs(effect["octaves"]))
        assert abs(best["octaves"]) > 0.585, name
        assert (best["octaves"] > 0) == (events[name]["direction"] == "rose"), name


def test_enough_quiet_nights_and_nothing_planted_on_them(truth: dict[str, Any]) -> None:
    quiet = set(truth["quiet_nights"])
    assert len([night for night in quiet if night >= "2031-03-16"]) >= 15  # of the last thirty nights
    assert not quiet & {event["night"] for event in truth["events"]}
    assert not quiet & {entry["night"] for entry in truth["faults"]}
    assert min(event["night"] for event in truth["events"]) == "2031-03-17"


def test_natural_change_and_crawl_noise_are_of_the_stated_size(truth: dict[str, Any]) -> None:
    calm = [row for row in truth["nights"] if row["night"] in truth["quiet_nights"]][1:]
    born = sum(row["born"] / row["links"] for row in calm) / len(calm)
    gone = sum(row["gone"] / row["links"] for row in calm) / len(calm)
    assert 0.002 < born < 0.0035
    assert 0.001 < gone < 0.002
    for row in calm:
        assert 0.975 < row["links_in_file"] / row["links"] < 0.999
    for row in truth["nights"]:
        if row["links_in_file"]:
            assert content(night_file(row["night"])).count(b"\n") - 1 == row["links_in_file"]


def test_tidemark_follows_are_weighted_handles() -> None:
    told = json.loads((TIDEMARK / "truth.json").read_text(encoding="utf-8"))
    files = sorted(TIDEMARK.glob("follows-*"))
    assert len(files) == 20
    assert [path.suffix for path in files].count(".gz") == 19
    for path in files:
        header, *rows = (line.split("\t") for line in content(path).decode().splitlines())
        assert header == ["follower", "followed", "interactions"]
        assert all(int(row[2]) > 0 and row[0].startswith("@") and row[1].startswith("@") for row in rows)
        for event in told["events"]:
            pairs = {tuple(pair) for pair in event["added"]}
            found = {(row[0], row[1]) for row in rows} & pairs
            if path.name.startswith(f"follows-{event['night']}"):
                assert found == pairs
            elif path.name < f"follows-{event['night']}":
                assert not found
    assert {event["event"] for event in told["events"]} == {"news", "fresh farm"}
