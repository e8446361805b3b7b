"""`swaygauge tune` and `swaygauge steadiness` on a small network, as a person types them."""

from __future__ import annotations

import json
import sys
import xml.etree.ElementTree as ET
from datetime import timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from night.support import run_all
from tests_support import FIRST, MiniWorld, write_settings
from typer.testing import CliRunner

from swaygauge.cli import app
from swaygauge.records import WAITING, LinkBook

HOSTILE = "<script>alert(1)</script>\u202e"
LAST = FIRST + timedelta(days=7)


@pytest.fixture(scope="module")
def settings(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("studies")
    file = write_settings(folder)
    world = MiniWorld()
    for name in world.names[:30]:
        world.links.add((name, HOSTILE))
    world.write(folder / "in", 8)
    run_all(file)
    return file


def run(*words: object, code: int = 0) -> str:
    result = CliRunner().invoke(app, [str(word) for word in words])
    assert result.exit_code == code, result.output + repr(result.exception)
    return result.output


def studies(settings: Path) -> Path:
    return settings.parent / "ws" / "mini" / "studies"


def drawn(path: Path) -> str:
    """The text of an SVG that parses and refers to nothing outside itself."""
    text = path.read_text(encoding="utf-8")
    root = ET.fromstring(text)
    assert root.tag == "{http://www.w3.org/2000/svg}svg"
    for element in root.iter():
        assert not element.tag.endswith("script")
        assert not any(name.endswith("href") or "url(http" in value for name, value in element.attrib.items())
    return text


def test_tune_prints_recommends_and_keeps(settings: Path) -> None:
    told = run("tune", settings)
    assert "first 12 places" in told  # a tenth of 121 nodes
    assert "Recommended share for katz" in told
    assert "Recommended share for fairshare" in told
    result = json.loads((studies(settings) / f"tune-{LAST}.json").read_text())
    assert result == json.loads(run("tune", settings, "--json"))
    rows = {(row["setting"]["score"], round(row["setting"]["share"], 2)): row for row in result["rows"]}
    assert {share for _, share in rows} >= {0.5, 0.6, 0.7, 0.8, 0.85, 0.9, 0.95}
    assert sum(row["setting"]["present"] for row in result["rows"]) == 2
    assert all(row["confirmed"] and not row["problem"] for row in result["rows"])
    assert len(result["quiet"]) >= 3
    svg = drawn(studies(settings) / f"tune-{LAST}.svg")
    assert "fairshare" in svg


def test_the_present_row_is_the_stored_score(settings: Path) -> None:
    result = json.loads(run("tune", settings, "--json", "--top", 5))
    present = next(row for row in result["rows"] if row["setting"]["present"] and row["setting"]["score"] == "katz")
    stored = json.loads(run("standing", settings, "--count", 1000, "--json"))["rows"]
    values = [row["value"] for row in stored]
    assert present["top_share"] == pytest.approx(sum(values[:5]) / sum(values), rel=1e-9)


def test_steadiness_measures_the_rate_and_checks_itself(settings: Path) -> None:
    told = run("steadiness", settings, "--draws", 40)
    assert "Checked with 40 resampling runs" in told
    assert "\u202e" not in told
    result = json.loads((studies(settings) / f"steadiness-{LAST}.json").read_text())
    assert result["rate"] == pytest.approx(measured_rate(settings))
    for score in result["scores"]:
        assert score["inside"] > 0.8
        for node in score["nodes"]:
            assert 1 <= node["first"] <= node["last"] <= 121
    assert HOSTILE in [node["name"] for node in result["scores"][0]["nodes"]]
    assert "<script>" not in drawn(studies(settings) / f"steadiness-{LAST}.svg")


def measured_rate(settings: Path) -> float:
    """The definition, from the books themselves: WAITING links among those of fetched sources, median over nights."""
    work, _ = run_all(settings)
    rates = []
    for number in range(1, 8):
        book = work.store.record(LinkBook, "mini", FIRST + timedelta(days=number), kind="book")
        seen = np.bincount(book.state, minlength=3)
        rates.append(seen[WAITING] / (seen[0] + seen[WAITING]))
    return float(np.median(rates))


def test_the_same_study_gives_the_same_bytes_and_the_store_stays_sound(settings: Path) -> None:
    run("tune", settings)
    run("steadiness", settings, "--draws", 5, "--rate", 0.02)
    before = {path.name: path.read_bytes() for path in studies(settings).iterdir()}
    run("tune", settings)
    run("steadiness", settings, "--draws", 5, "--rate", 0.02)
    assert {path.name: path.read_bytes() for path in studies(settings).iterdir()} == before
    assert "0 damaged part(s), 0 finding(s)" in run("checkup", settings)


def test_without_the_drawing_library_the_description_is_kept(settings: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "vl_convert", None)
    told = run("tune", settings)
    assert "vl-convert-python is not installed" in told
    spec: Any = json.loads((studies(settings) / f"tune-{LAST}.vl.json").read_text())
    assert len(spec["concat"]) == 4
    (studies(settings) / f"tune-{LAST}.vl.json").unlink()


def test_an_earlier_night_and_a_rate_of_ones_own(settings: Path) -> None:
    earlier = FIRST + timedelta(days=3)
    result = json.loads(run("steadiness", settings, "--night", earlier, "--rate", 0.1, "--draws", 5, "--json"))
    assert result["night"] == earlier.isoformat()
    assert result["rate_measured_on_nights"] is None
    first = json.loads(run("tune", settings, "--night", FIRST, "--json"))
    assert first["quiet"] == []
    assert all(each["share"] is None for each in first["advice"])


def test_wrong_words(settings: Path, tmp_path: Path) -> None:
    run("tune", "no-such-network", code=2)
    run("tune", settings, "--night", "1999-01-01", code=5)
    run("steadiness", settings, "--night", FIRST, code=5)  # nothing can have been missed on the first night
    assert "rate: expected a share" in run("steadiness", settings, "--rate", 2, code=1)
    empty = write_settings(tmp_path)
    assert "no scored night" in run("tune", empty, code=5)
