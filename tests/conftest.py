"""Shared by all tests: nothing leaves the machine, nothing is kept outside the test's own folder."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable
from pathlib import Path

import pytest
from tests_support import MiniWorld, snapshot_of, write_settings

from swaygauge.records import Snapshot

os.environ["GX_ANALYTICS_ENABLED"] = "false"
os.environ["DO_NOT_TRACK"] = "1"
os.environ["PREFECT_SERVER_ANALYTICS_ENABLED"] = "false"
os.environ.pop("PREFECT_API_URL", None)


@pytest.fixture
def mini(tmp_path: Path) -> Callable[..., Path]:
    """mini(nights, ...) -> the settings file of a MiniWorld with so many nights of snapshots."""

    def make(nights: int = 4, *, seed: int = 7, extra: str = "", snapshots: str = "", skip: Iterable[int] = ()) -> Path:
        file = write_settings(tmp_path, extra=extra, snapshots=snapshots)
        MiniWorld(seed).write(tmp_path / "in", nights, skip=skip)
        return file

    return make


@pytest.fixture(scope="session", name="snapshot_of")
def _snapshot_of() -> Callable[..., Snapshot]:
    return snapshot_of
