"""Commands as a person types them: what they print, their JSON, their exit codes."""

from __future__ import annotations

import json
from datetime import date, timedelta
from pathlib import Path
from typing import Any

import pytest
from night.support import run_all
from tests_support import FIRST, MiniWorld, write_night, write_settings
from typer.testing import CliRunner

from swaygauge.cli import app

HOSTILE = "\x1b[31mred\x1b[0m\u202eevil<script>"


def day(number: int) -> date:
    return FIRST + timedelta(days=number)


@pytest.fixture(scope="module")
def settings(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Twelve nights with a gap, a held night and a hostile name in a high place."""
    folder = tmp_path_factory.mktemp("commands")
    file = write_settings(folder)
    world = MiniWorld()
    for name in world.names[:40]:
        world.links.add((name, HOSTILE))
    for number in range(12):
        if number == 10:
            write_night(folder / "in", day(number), sorted(world.links)[:30])
        elif number != 6:
            write_night(folder / "in", day(number), world.links)
        world.step()
    for number in range(40):
        world.links.add((f"fresh{number:02d}.example", "n100.example"))
    write_night(folder / "in", day(12), world.links)
    run_all(file)
    return file


def run(*words: object, code: int = 0) -> str:
    result = CliRunner().invoke(app, [str(word) for word in words])
    assert result.exit_code == code, result.output + repr(result.exception)
    return result.output


def load(*words: object) -> Any:
    return json.loads(run(*words, "--json"))


def test_brief_says_sound_or_not_what_moved_and_how_unusual_it_is(settings: Path) -> None:
    told = run("brief", settings)
    assert "Can it be trusted?  sound" in told
    assert "n100.example rose from place" in told
    assert "How unusual is that?" in told
    assert "not evidence" in told
    assert load("brief", settings)["row"]["night"] == day(12).isoformat()


def test_brief_of_a_held_night_says_why_first(settings: Path) -> None:
    told = run("brief", settings, "--night", day(10))
    assert told.splitlines()[2].startswith("Can it be trusted?  held")
    assert "kept" in told


def test_standing_pages_and_searches(settings: Path) -> None:
    rows = load("standing", settings, "--count", 5, "--first", 3)["rows"]
    assert rows[0]["rank"] == 3
    assert len(rows) == 5
    found = load("standing", settings, "--search", "n100")["rows"]
    assert [row["name"] for row in found] == ["n100.example"]
    assert "n100.example" in run("standing", settings, "--search", "n100")
    assert "no node matches" in run("standing", settings, "--search", "nothing-like-it")


def test_moves_in_octaves_by_direction(settings: Path) -> None:
    rows = load("moves", settings, "--score", "fairshare", "--direction", "rose")["rows"]
    assert rows[0]["name"] == "n100.example"
    assert rows[0]["octaves"] > 2
    assert all(row["direction"] == "rose" for row in rows)
    assert "octaves" in run("moves", settings)


def test_alerts_of_a_night_and_since_one(settings: Path) -> None:
    tonight = load("alerts", settings)
    assert {row["night"] for row in tonight} == {day(12).isoformat()}
    since = load("alerts", settings, "--since", day(0))
    assert len(since) > len(tonight)
    assert {row["kind"] for row in load("alerts", settings, "--since", day(0), "--kind", "held")} == {"held"}


def test_trace_draws_the_path_with_its_gap(settings: Path) -> None:
    told = run("trace", settings, "n100.example")
    assert "•" in told
    assert "surge" in told
    points = load("trace", settings, "n100.example")["points"]
    assert day(6).isoformat() not in [point["night"] for point in points]
    assert next(point for point in points if point["night"] == day(10).isoformat())["rank"] is None


def test_an_unknown_name_offers_close_ones(settings: Path) -> None:
    assert "Close: " in run("trace", settings, "n10.exampl", code=5)


def test_hostile_names_are_inert_in_text_and_exact_in_json(settings: Path) -> None:
    told = run("standing", settings, "--count", 1000)
    assert "\x1b" not in told
    assert "\u202e" not in told
    assert "\\u202e" in told
    assert HOSTILE in [row["name"] for row in load("standing", settings, "--count", 1000)["rows"]]
    assert "\u202e" not in run("trace", settings, HOSTILE)


def test_nights_lists_states_and_gaps(settings: Path) -> None:
    rows = {row["night"]: row for row in load("nights", settings)}
    assert rows[day(10).isoformat()]["state"] == "held"
    assert rows[day(7).isoformat()]["gap_nights"] == 1
    assert "held" in run("nights", settings)


def test_checkup_finds_a_damaged_part(settings: Path) -> None:
    assert "0 damaged" in run("checkup", settings)
    part = next((settings.parent / "ws" / "mini" / "scores").rglob("*.parquet"))
    kept = part.read_bytes()
    part.write_bytes(kept[:-1] + bytes([kept[-1] ^ 1]))
    try:
        assert part.name in run("checkup", settings, code=6)
        assert any(finding["level"] == "damaged" for finding in json.loads(run("checkup", settings, "--json", code=6)))
    finally:
        part.write_bytes(kept)


def test_config_check(settings: Path, tmp_path: Path) -> None:
    assert "in order" in run("config", "check", settings)
    bad = write_settings(tmp_path, extra="typo = 1")
    run("config", "check", bad, code=2)
    assert json.loads(run("config", "check", bad, "--json", code=2))["problems"]


def test_wrong_words_and_unknown_networks(settings: Path) -> None:
    run("standing", settings, "--score", "other", code=2)
    run("moves", settings, "--direction", "sideways", code=2)
    run("brief", "no-such-network", code=2)
    run("brief", settings, "--night", "1999-01-01", code=5)
    run("night", settings, "--accept-anyway", code=2)
