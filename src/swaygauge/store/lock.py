"""One run per network at a time: a lock that the kernel frees when its holder dies, however it dies."""

from __future__ import annotations

import fcntl
import hashlib
import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import sqlalchemy as sa

from swaygauge.errors import Busy
from swaygauge.store.catalog import Catalog
from swaygauge.store.files import make_folder


@contextmanager
def hold_network(catalog: Catalog, workspace: Path, network: str) -> Iterator[None]:
    """Hold a network. Raises Busy at once when another process or thread holds it.

    The lock is a file of the workspace; a shared PostgreSQL catalog is locked too, for runs on other machines.
    """
    folder = workspace / network
    make_folder(folder)
    with _held_file(folder / ".lock", network):
        if catalog.is_sqlite:
            yield
        else:
            with _held_database(catalog, network):
                yield


@contextmanager
def _held_file(path: Path, network: str) -> Iterator[None]:
    handle = os.open(path, os.O_RDWR | os.O_CREAT | os.O_CLOEXEC, 0o666)
    try:
        try:
            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            holder = os.read(handle, 20).decode("ascii", "replace").strip() or "unknown"
            raise Busy(
                f"{network}: another run holds it (process {holder}). Wait for it to end, then try again."
            ) from None
        os.ftruncate(handle, 0)
        os.pwrite(handle, f"{os.getpid()}\n".encode(), 0)
        yield
    finally:
        os.close(handle)


@contextmanager
def _held_database(catalog: Catalog, network: str) -> Iterator[None]:
    key = int.from_bytes(hashlib.sha256(f"swaygauge {network}".encode()).digest()[:8], "big", signed=True)
    with catalog.session() as connection:
        if not connection.scalar(sa.select(sa.func.pg_try_advisory_lock(key))):
            raise Busy(f"{network}: a run on another machine holds it. Wait for it to end, then try again.")
        connection.commit()  # the lock belongs to the session; no transaction stays open under it
        try:
            yield
        finally:
            connection.scalar(sa.select(sa.func.pg_advisory_unlock(key)))
            connection.commit()
