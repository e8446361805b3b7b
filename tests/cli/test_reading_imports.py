"""Reading commands stay light: a fresh process imports none of the heavy libraries."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest
from night.support import run_all
from tests_support import MiniWorld, write_settings

HEAVY = (
    "prefect",
    "pandas",
    "great_expectations",
    "sqlalchemy",
    "numpy",
    "numba",
    "scipy",
    "pyarrow",
)  # pydantic comes with typer
SCRIPT = f"""
import sys
from swaygauge.cli import app
try:
    app(sys.argv[1:], standalone_mode=False)
finally:
    loaded = sorted(name for name in {HEAVY!r} if name in sys.modules)
    print("LOADED", *loaded)
"""


@pytest.fixture(scope="module")
def settings(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("light")
    file = write_settings(folder)
    MiniWorld().write(folder / "in", 3)
    run_all(file)
    return file


@pytest.mark.parametrize(
    "command",
    [
        ["brief", "FILE"],
        ["standing", "FILE", "--count", "3"],
        ["moves", "FILE"],
        ["alerts", "FILE", "--since", "2030-01-01"],
        ["trace", "FILE", "n000.example"],
        ["nights", "FILE", "--json"],
    ],
    ids=lambda command: command[0],
)
def test_a_reading_command_imports_nothing_heavy(settings: Path, command: list[str]) -> None:
    words = [str(settings) if word == "FILE" else word for word in command]
    done = subprocess.run([sys.executable, "-c", SCRIPT, *words], capture_output=True, text=True, check=True)
    assert done.stdout.splitlines()[-1] == "LOADED", done.stdout + done.stderr
