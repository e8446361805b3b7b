"""The demo: the main job on an invented world, from an empty workspace, through the same flows as any network."""

from __future__ import annotations

import re
import shutil
import time
from datetime import timedelta
from pathlib import Path
from typing import Annotated

import typer

from swaygauge.cli.brief import brief_lines
from swaygauge.cli.context import place_of, reader_of
from swaygauge.cli.output import say
from swaygauge.cli.running import say_if_compiling, tell
from swaygauge.config.place import Place, read_place
from swaygauge.errors import ConfigError
from swaygauge.visible import visible

WORKSPACE = "demo"  # the only folder name that the demo ever empties
LATE = 2  # days that a late file is behind
PATHS = re.compile(r'^(folder|aliases|workspace) = "(.+)"$', re.MULTILINE)


def _empty(place: Place) -> None:
    """Remove what an earlier demo stored (but not Prefect's own database, which is slow to make)."""
    if place.workspace.name != WORKSPACE:
        found = f"workspace: the demo runs only in a folder called {WORKSPACE!r}, got {place.workspace.name!r}"
        raise ConfigError(str(place.file), [found])
    for child in place.workspace.iterdir() if place.workspace.exists() else ():
        if child.name != ".prefect":
            shutil.rmtree(child) if child.is_dir() else child.unlink()


def _incoming(place: Place) -> tuple[Place, Path]:
    """The network with a snapshot folder of its own, still empty, in the workspace; and where its files really are."""
    incoming = place.workspace / ".incoming"
    incoming.mkdir(parents=True)
    text = place.file.read_text(encoding="utf-8")
    base = place.file.parent.resolve()
    paths = {key: (base / value).resolve() for key, value in PATHS.findall(text)}
    data = paths["folder"]
    paths["folder"] = incoming
    text = PATHS.sub(lambda found: f'{found[1]} = "{paths[found[1]]}"', text)
    file = incoming / "settings.toml"
    file.write_text(text, encoding="utf-8")
    return read_place(file), data


def _deliver(files: list[Path], incoming: Path) -> None:
    for file in files:
        shutil.copy2(file, incoming / file.name)


def demo(
    network: Annotated[str, typer.Argument(help="Which demo: ostrel or tidemark.")] = "ostrel",
) -> None:
    """Replay the demo world from an empty workspace: history as backfill, the newest files as a night, the brief."""
    given = place_of(network)
    _empty(given)
    place, data = _incoming(given)
    from swaygauge.flows.prepare import prepare

    prepare(place.workspace)
    from swaygauge.config.settings import load_settings
    from swaygauge.readers.nights import find_snapshots

    clock = time.perf_counter()
    pattern = load_settings(place.file).snapshots.pattern
    nights = find_snapshots(data, pattern).nights
    late = find_snapshots(data / "late", pattern).nights if (data / "late").is_dir() else {}
    first, last = min(nights), max(nights)
    incoming = place.workspace / ".incoming"
    say_if_compiling()
    say(f"{place.title}: starting the flows (the first start makes a database and takes longer) ...")
    from swaygauge.flows.start import run_backfill, run_nightly

    told_late = max(late, default=first) + timedelta(days=LATE)
    early = [path for night, path in nights.items() if late and night <= told_late and night < last]
    done = []
    if early:
        _deliver(early, incoming)
        say(f"backfill: the first {len(early)} nights, from {first}")
        done += run_backfill(place.file, None, None, again=False, tell=tell)
    _deliver([*late.values(), *(path for night, path in nights.items() if night < last)], incoming)
    news = "".join(f" {path.name} arrives late: what rests on it is replayed." for path in late.values())
    say(f"backfill: up to the last night but one.{news}")
    done += run_backfill(place.file, None, None, again=False, tell=tell)
    _deliver([nights[last]], incoming)
    say(f"night: {last} arrives")
    done += run_nightly(place.file, None, tell)
    say(f"{len(done)} night runs in {time.perf_counter() - clock:.0f} s")
    say()
    reader = reader_of(place)
    for line in brief_lines(place, reader, reader.night(place.network, last)):
        say(line)
    say()
    told = reader.alerts(place.network, first=last, last=last)
    name = next((visible(alert.node_name) for alert in told if alert.node >= 0), "NAME")
    say("What to type next (first: source .venv/bin/activate):")
    for line in (
        f"swaygauge trace {place.network} {name} --score fairshare",
        f"swaygauge alerts {place.network} --since {first}",
        f"swaygauge standing {place.network}",
        f"swaygauge nights {place.network}",
    ):
        say("  " + line)
