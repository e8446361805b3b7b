"""Which file is which night."""

from datetime import date, timedelta

import pytest

from swaygauge.errors import UnclearNight, UnreadableFile
from swaygauge.readers.nights import check_pattern, file_of_night, find_snapshots


def put(folder, *names):
    for name in names:
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text("x", encoding="utf-8")


def test_nights_in_date_order(tmp_path):
    put(tmp_path, *(f"links-{night}.csv.gz" for night in ("2025-03-10", "2025-03-09", "2024-02-29")))
    put(tmp_path, "readme.txt", ".links-2025-03-11.csv.gz")
    found = find_snapshots(tmp_path, "links-{night}.csv.gz")
    assert list(found.nights) == [date(2024, 2, 29), date(2025, 3, 9), date(2025, 3, 10)]
    assert found.nights[date(2025, 3, 9)] == tmp_path / "links-2025-03-09.csv.gz"
    assert found.problems == ()
    assert found.ignored == ("readme.txt",)


@pytest.mark.parametrize(
    ("pattern", "name"),
    [
        ("{night:%Y%m%d}.tsv", "20250309.tsv"),
        ("{night:%Y%m%d}.tsv", "20250309.tsv.zst"),
        ("{night:%d.%m.%y}-net.parquet", "09.03.25-net.parquet"),
        ("crawl {night:%Y-%j}.csv", "crawl 2025-068.csv.gz"),
        ("night={night}/part-*.csv", "night=2025-03-09/part-0.csv"),
        ("a+b[1]?({night}).csv", "a+b[1]?(2025-03-09).csv"),
    ],
)
def test_forms_of_the_night(tmp_path, pattern, name):
    put(tmp_path, name)
    night = date(2025, 3, 9)
    assert find_snapshots(tmp_path, pattern).nights == {night: tmp_path / name}
    assert file_of_night(tmp_path, pattern, night=night) == tmp_path / name
    assert file_of_night(tmp_path, pattern, night=night + timedelta(1)) is None


def test_impossible_dates_are_named_and_stop_no_other_night(tmp_path):
    put(tmp_path, *(f"links-{text}.csv" for text in ("2025-02-30", "2025-3-9", "20250-01-01", "2025-03-10", "x")))
    found = find_snapshots(tmp_path, "links-{night}.csv")
    assert list(found.nights) == [date(2025, 3, 10)]
    told = [str(problem) for problem in found.problems]
    assert all(isinstance(problem, UnclearNight) for problem in found.problems)
    assert [line.split(":")[0] for line in told] == [
        "links-2025-02-30.csv",
        "links-2025-3-9.csv",
        "links-20250-01-01.csv",
    ]
    assert "'2025-02-30' is no date of the form '%Y-%m-%d'" in told[0]
    assert found.ignored == ("links-x.csv",)


def test_two_files_for_one_night_are_both_named(tmp_path):
    put(tmp_path, "links-2025-03-09.csv", "links-2025-03-09.csv.gz", "links-2025-03-10.csv")
    found = find_snapshots(tmp_path, "links-{night}.csv")
    assert list(found.nights) == [date(2025, 3, 10)]
    (problem,) = found.problems
    assert isinstance(problem, UnclearNight)
    words = "2 files for the night 2025-03-09: links-2025-03-09.csv, links-2025-03-09.csv.gz"
    assert words in str(problem)
    with pytest.raises(UnclearNight, match=words):
        file_of_night(tmp_path, "links-{night}.csv", night=date(2025, 3, 9))


def test_a_folder_or_a_dead_link_in_a_file_s_place(tmp_path):
    (tmp_path / "links-2025-03-09.csv").mkdir()
    (tmp_path / "links-2025-03-10.csv").symlink_to(tmp_path / "nowhere")
    found = find_snapshots(tmp_path, "links-{night}.csv")
    assert found.nights == {}
    assert [type(problem) for problem in found.problems] == [UnreadableFile, UnreadableFile]
    assert "got a folder" in str(found.problems[0])
    assert "leads nowhere" in str(found.problems[1])


@pytest.mark.parametrize(
    "pattern",
    [
        "",
        "links.csv",
        "{night}-{night}.csv",
        "{night:%Y-%m}.csv",
        "{night:%b %d %Y}.csv",
        "{night:%s}.csv",
        "{night:%Y%m%d%}",
        "{night:%Y/%m/%d}.csv",
        "**/{night}.csv",
        "/data/{night}.csv",
        "../{night}.csv",
    ],
)
def test_patterns_that_cannot_tell_nights_apart(pattern):
    with pytest.raises(UnclearNight, match="got "):
        check_pattern(pattern)


def test_a_missing_folder(tmp_path):
    with pytest.raises(UnreadableFile, match=r"no such folder\. Set snapshots\.folder"):
        find_snapshots(tmp_path / "no", "{night}.csv")
