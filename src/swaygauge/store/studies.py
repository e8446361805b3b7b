"""Results of studies: files for people beside the nights of a network. No night rests on them."""

from __future__ import annotations

from datetime import date
from pathlib import Path

from swaygauge.store.files import sha256_of, write_whole
from swaygauge.store.layout import STUDIES, check_kind, check_name


def write_study(workspace: Path, network: str, night: date, *, kind: str, suffix: str, text: str) -> Path:
    """Keep one file of a study of one night, replacing an earlier one; the path it has now.

    kind: the study, "tune" or "steadiness". suffix: "json", "svg" or "vl.json". A reader sees the earlier file or the
    new one, never half of one. Raises StoreError for words that cannot be part of a path.
    """
    check_kind(kind)
    path = workspace / check_name(network) / STUDIES / f"{kind}-{night.isoformat()}.{suffix}"
    data = text.encode("utf-8")
    write_whole(path, data, sha256_of(data))
    return path
