"""What must be true of the process before Prefect is imported: offline, quiet, with a home of its own."""

from __future__ import annotations

import os
from pathlib import Path

QUIET = {
    "PREFECT_SERVER_ANALYTICS_ENABLED": "false",
    "DO_NOT_TRACK": "1",
    "PREFECT_SERVER_UI_SHOW_PROMOTIONAL_CONTENT": "false",
    "PREFECT_CLIENT_SERVER_VERSION_CHECK_ENABLED": "false",
    # the first start creates Prefect's database, which a busy machine may take a minute over
    "PREFECT_SERVER_EPHEMERAL_STARTUP_TIMEOUT_SECONDS": "180",
    "PREFECT_LOGGING_LEVEL": "WARNING",
    "PREFECT_LOGGING_SERVER_LEVEL": "ERROR",
    # a lease in a file outlives a restart of the server; one in memory would leave its slot taken for ever
    "PREFECT_SERVER_CONCURRENCY_LEASE_STORAGE": "prefect.server.concurrency.lease_storage.filesystem",
    # larger batches: otherwise the end of a flow waits for its task runs to be recorded one by one
    "PREFECT_SERVER_SERVICES_TASK_RUN_RECORDER_BATCH_SIZE": "100",
    "PREFECT_SERVER_SERVICES_TASK_RUN_RECORDER_READ_BATCH_SIZE": "100",
    "PREFECT_SERVER_SERVICES_TASK_RUN_RECORDER_FLUSH_INTERVAL": "0.5",
    "PREFECT_SERVER_SERVICES_EVENT_PERSISTER_READ_BATCH_SIZE": "100",
}


def prepare(workspace: Path) -> None:
    """Set what the person has not set. Call before prefect is first imported; a PREFECT_API_URL they set is used."""
    for key, value in QUIET.items():
        os.environ.setdefault(key, value)
    home = Path(os.environ.setdefault("PREFECT_HOME", str(workspace / ".prefect")))
    home.mkdir(parents=True, exist_ok=True)
