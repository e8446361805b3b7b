"""Files that are whole or not there: written beside their place, forced to disk, renamed in."""

from __future__ import annotations

import hashlib
import os
import threading
from contextlib import suppress
from pathlib import Path

from swaygauge.errors import Damaged


def sha256_of(data: bytes | memoryview) -> str:
    """Hex SHA-256."""
    return hashlib.sha256(data).hexdigest()


def make_folder(folder: Path) -> None:
    """Create a folder and those above it, each on disk before the next."""
    if folder.is_dir():
        return
    make_folder(folder.parent)
    with suppress(FileExistsError):
        folder.mkdir()
    sync_folder(folder.parent)


def sync_folder(folder: Path) -> None:
    """Force a folder's entries to disk."""
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)


def write_whole(path: Path, data: bytes | memoryview, sha256: str) -> None:
    """Put a content-named file in its place, unless the same bytes already are there.

    A file that is there with other bytes (a damaged disk) is replaced. One that is there is marked as new, so that a
    sweep of superfluous files leaves it alone until its row is written.
    """
    if path.is_file() and path.stat().st_size == len(data) and sha256_of(path.read_bytes()) == sha256:
        os.utime(path)
        return
    make_folder(path.parent)
    beside = path.with_name(f".{path.name}.{os.getpid()}-{threading.get_ident()}")
    try:
        with beside.open("wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        beside.replace(path)
    except BaseException:
        beside.unlink(missing_ok=True)
        raise
    sync_folder(path.parent)


def read_whole(path: Path, *, size: int, sha256: str, what: str, todo: str) -> bytes:
    """The file's bytes, if they are those of the catalog. Raises Damaged."""
    try:
        data = path.read_bytes()
    except FileNotFoundError:
        raise Damaged(f"{what}: the file {path} is missing. {todo}") from None
    if len(data) != size:
        raise Damaged(f"{what}: {path} has {len(data)} bytes, expected {size}. {todo}")
    found = sha256_of(data)
    if found != sha256:
        raise Damaged(f"{what}: {path} has SHA-256 {found[:16]}..., expected {sha256[:16]}.... {todo}")
    return data
