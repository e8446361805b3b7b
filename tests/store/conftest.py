"""An empty workspace; the example nights beside this file are importable by name."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from swaygauge.store import Store

sys.path.insert(0, str(Path(__file__).parent))


@pytest.fixture
def store(tmp_path: Path) -> Iterator[Store]:
    with Store.open(tmp_path / "work") as opened:
        yield opened
