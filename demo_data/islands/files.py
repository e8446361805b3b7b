"""Writing nights and truth so that the same content always gives the same bytes."""

from __future__ import annotations

import gzip
import json
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any


def write_table(path: Path, header: Sequence[str], rows: Iterable[Sequence[str]], *, separator: str) -> None:
    """Rows sorted by their text; gzip without name and time when the path ends in .gz. No cell here needs quoting."""
    lines = sorted(separator.join(row) for row in rows)
    data = ("\n".join([separator.join(header), *lines]) + "\n").encode()
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes(gzip.compress(data, 6, mtime=0) if path.suffix == ".gz" else data)


def write_json(path: Path, content: dict[str, Any]) -> None:
    """One top-level entry or event a line: readable, and a change shows as a changed line."""
    path.parent.mkdir(parents=True, exist_ok=True)
    parts = []
    for key, value in content.items():
        if isinstance(value, list) and value and isinstance(value[0], dict):
            inner = ",\n".join("    " + json.dumps(item, ensure_ascii=False) for item in value)
            parts.append(f"  {json.dumps(key)}: [\n{inner}\n  ]")
        else:
            parts.append(f"  {json.dumps(key)}: {json.dumps(value, ensure_ascii=False)}")
    path.write_text("{\n" + ",\n".join(parts) + "\n}\n", encoding="utf-8")
