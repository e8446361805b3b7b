"""Settings: every mistake at once, each with key path, value and expectation; the shipped ones are in order."""

from __future__ import annotations

import dataclasses
from pathlib import Path

import pytest
from tests_support import write_settings

from swaygauge.config.place import find_file, read_place
from swaygauge.config.settings import load_settings
from swaygauge.errors import ConfigError

ROOT = Path(__file__).parents[2]


@pytest.mark.parametrize("file", sorted((ROOT / "config").glob("*.toml")), ids=lambda file: file.stem)
def test_shipped_settings_are_in_order(file: Path) -> None:
    settings = load_settings(file)
    assert read_place(file).network == settings.network


def test_defaults_need_only_a_network_a_workspace_and_a_folder(tmp_path: Path) -> None:
    (tmp_path / "in").mkdir()
    file = tmp_path / "x.toml"
    file.write_text('network = "x"\nworkspace = "w"\n[snapshots]\nfolder = "in"\n')
    settings = load_settings(file)
    assert settings.scores.katz.share == 0.80
    assert settings.scores.katz.limit == 0.90
    assert settings.scores.fairshare.alpha == 0.85


def test_every_mistake_is_reported_at_once_with_path_value_and_expectation(tmp_path: Path) -> None:
    file = write_settings(
        tmp_path,
        extra="wieght = 3\nheader = 1\n[scores.katz]\nshare = -1\ntolerance = 'small'\n[upkeep]\ncarry_nights = 2.5\n"
        "[alerts.surge]\nq = 3\n[checks]\nkept = 'x'\n[nonsense]\na = 1\n",
        snapshots="every_nights = 0",
    )
    with pytest.raises(ConfigError) as caught:
        load_settings(file)
    told = "\n".join(caught.value.problems)
    for path, value in {
        "snapshots.every_nights": "got 0",
        "reader.wieght": "no such setting",
        "reader.header": "got 1",
        "scores.katz.share": "got -1",
        "scores.katz.tolerance": "got 'small'",
        "upkeep.carry_nights": "got 2.5",
        "alerts.surge.q": "got 3",
        "nonsense": "no such setting",
    }.items():
        line = next((problem for problem in caught.value.problems if problem.startswith(path + ":")), "")
        assert line, f"{path} is not reported in:\n{told}"
        assert value in line


def test_what_types_cannot_say_is_checked_too(tmp_path: Path) -> None:
    file = write_settings(tmp_path, snapshots='deadline = "25:00"\naliases = "none.csv"')
    text = (
        file.read_text().replace('folder = "in"', 'folder = "nowhere"').replace('network = "mini"', 'network = "a b"')
    )
    text = text.replace("links-{night}.csv", "links.csv")
    file.write_text(text + '[schedule]\ncron = "daily"\ntimezone = "Nowhere/City"\n[scores.katz]\nshare = 0.95\n')
    with pytest.raises(ConfigError) as caught:
        load_settings(file)
    paths = [problem.split(":")[0] for problem in caught.value.problems]
    assert set(paths) == {
        "network",
        "snapshots.folder",
        "snapshots.pattern",
        "snapshots.aliases",
        "snapshots.deadline",
        "scores.katz.share",
        "schedule.cron",
        "schedule.timezone",
    }


@pytest.mark.parametrize("text", ["network = ", b"network = '\xff'"])
def test_a_file_that_is_not_toml(tmp_path: Path, text: str | bytes) -> None:
    file = tmp_path / "x.toml"
    file.write_bytes(text if isinstance(text, bytes) else text.encode())
    with pytest.raises(ConfigError, match="not valid TOML"):
        load_settings(file)


def test_an_unknown_network_names_those_there_are(tmp_path: Path) -> None:
    write_settings(tmp_path)
    with pytest.raises(ConfigError, match="There is: mini"):
        find_file("maxi", tmp_path)
    with pytest.raises(ConfigError, match="no settings"):
        find_file("../mini", tmp_path)


def test_the_digest_follows_what_can_change_a_number_and_nothing_else(tmp_path: Path) -> None:
    settings = load_settings(write_settings(tmp_path))
    moved = dataclasses.replace(settings, workspace="elsewhere", title="Other")
    assert moved.digest() == settings.digest()
    limits = dataclasses.replace(settings.upkeep, carry_nights=3)
    assert dataclasses.replace(settings, upkeep=limits).digest() != settings.digest()
