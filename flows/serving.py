"""Serving a network's nightly flow by its cron line: one process, with its own Prefect server unless one is set."""

from __future__ import annotations

import os
import socket
import subprocess
import sys
import time
import urllib.error
import urllib.request
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

from swaygauge.config.settings import load_settings
from swaygauge.errors import SwaygaugeError

PATIENCE = 90  # seconds a server may take to come up (its first start creates its database)


def _free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


def _wait_until_up(url: str, server: subprocess.Popen[bytes]) -> None:
    deadline = time.monotonic() + PATIENCE
    while time.monotonic() < deadline:
        if server.poll() is not None:
            break
        try:
            with urllib.request.urlopen(f"{url}/health", timeout=2):
                return
        except (urllib.error.URLError, TimeoutError, ConnectionError):
            time.sleep(0.5)
    raise SwaygaugeError(
        f"the Prefect server did not come up within {PATIENCE} s. Run `prefect server start` by hand to see why, "
        "or set PREFECT_API_URL to a server that runs."
    )


@contextmanager
def local_server() -> Iterator[str]:
    """The address of a Prefect server: the one that PREFECT_API_URL names, else one of our own on loopback."""
    given = os.environ.get("PREFECT_API_URL")
    if given:
        yield given
        return
    port = _free_port()
    url = f"http://127.0.0.1:{port}/api"
    command = [sys.executable, "-m", "prefect", "server", "start", "--host", "127.0.0.1", "--port", str(port)]
    server = subprocess.Popen(command, stdout=subprocess.DEVNULL)
    try:
        _wait_until_up(url, server)
        os.environ["PREFECT_API_URL"] = url
        yield url
    finally:
        os.environ.pop("PREFECT_API_URL", None)
        server.terminate()
        server.wait(timeout=30)


def serve_network(file: Path, say: Callable[[str], None]) -> None:
    """Run the nightly flow at every tick of the network's cron line until interrupted. Raises ConfigError first."""
    settings = load_settings(file)
    plan = settings.schedule
    with local_server() as url:
        from prefect.client.schemas.objects import ConcurrencyLimitConfig, ConcurrencyLimitStrategy
        from prefect.schedules import Cron
        from prefect.types.entrypoint import EntrypointType

        from swaygauge.flows.nightly import nightly

        say(f"{settings.network}: nights start at cron '{plan.cron}' ({plan.timezone}); server {url}; Ctrl-C ends it.")
        nightly.serve(
            name=f"nightly-{settings.network}",
            schedule=Cron(plan.cron, timezone=plan.timezone),
            parameters={"config": str(file.resolve())},
            global_limit=ConcurrencyLimitConfig(limit=1, collision_strategy=ConcurrencyLimitStrategy.CANCEL_NEW),
            pause_on_shutdown=False,
            # a run imports the installed package, wherever it was started
            entrypoint_type=EntrypointType.MODULE_PATH,
        )
