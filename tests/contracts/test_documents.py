"""The documents keep up with the code: every score, alert kind, reader, setting and command is in them."""

from __future__ import annotations

import dataclasses
import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any, get_type_hints

import pytest
import typer.main

from swaygauge.cli import app
from swaygauge.config.settings import Settings
from swaygauge.detect import KINDS
from swaygauge.readers import READERS
from swaygauge.scores import SCORES

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def settings_of(cls: Any, path: str = "") -> Iterator[tuple[str, str]]:
    """(section, key) of every setting."""
    hints = get_type_hints(cls)
    for item in dataclasses.fields(cls):
        inner = hints[item.name]
        if dataclasses.is_dataclass(inner):
            yield from settings_of(inner, f"{path}.{item.name}".strip("."))
        else:
            yield path, item.name


@pytest.mark.parametrize(("section", "key"), sorted(settings_of(Settings)), ids=lambda value: value or "top")
def test_every_setting_is_explained_in_its_section(section: str, key: str) -> None:
    text = README
    if section:
        assert f"`[{section}]`" in README
        text = README.split(f"`[{section}]`", 1)[1].split("\n`[", 1)[0]
    rows = [line for line in text.splitlines() if line.startswith(f"| `{key}` |")]
    assert rows, f"README.md does not explain {section}.{key}"
    assert len(rows[0].split("|")[3].strip()) > 3, f"README.md leaves the meaning of {section}.{key} empty"


def _commands() -> Iterator[str]:
    group: Any = typer.main.get_command(app)
    for name, command in group.commands.items():
        inner = getattr(command, "commands", None)
        yield from (f"{name} {each}" for each in inner) if inner else (name,)


@pytest.mark.parametrize("command", sorted(_commands()))
def test_every_command_is_listed(command: str) -> None:
    assert f"`swaygauge {command}" in README


@pytest.mark.parametrize("name", sorted([*SCORES, *KINDS, *READERS]))
def test_every_score_kind_and_reader_is_named(name: str) -> None:
    assert re.search(rf"`{name}`|\b{name}\b", README)


def test_the_readme_opens_with_the_job_and_the_two_commands() -> None:
    first = README.split("\n\n")[1]
    for word in ("snapshot", "standing", "trusted", "decision"):
        assert word in first
    assert "make demo" in README
    assert "make test" in README
    ci = (ROOT / ".ci" / "run").read_text()
    assert "make demo" in ci
    assert "make test" in ci


def test_the_notebook_example_runs(capsys: pytest.CaptureFixture[str]) -> None:
    code = README.split("```python\n", 1)[1].split("```", 1)[0]
    exec(compile(code, "README.md", "exec"), {})
    assert capsys.readouterr().out.startswith("1 bob ")


def test_nothing_names_an_index_address() -> None:
    for line in (ROOT / "config" / "constraints.txt").read_text().splitlines():
        assert re.fullmatch(r"[A-Za-z0-9_.-]+==[A-Za-z0-9_.!+-]+", line), line
