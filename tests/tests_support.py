"""Small networks written as snapshot files, for tests of the night, the flows and the command line."""

from __future__ import annotations

import gzip
import random
from collections.abc import Iterable, Mapping
from datetime import date, timedelta
from pathlib import Path

import numpy as np

from swaygauge.records import Origin, Snapshot

FIRST = date(2030, 1, 1)
Links = set[tuple[str, str]]


def write_settings(folder: Path, network: str = "mini", *, extra: str = "", snapshots: str = "") -> Path:
    """The TOML file of a small network whose snapshots arrive in ``folder``/in."""
    (folder / "in").mkdir(exist_ok=True)
    file = folder / f"{network}.toml"
    file.write_text(
        f'network = "{network}"\nworkspace = "ws"\n'
        f'[snapshots]\nfolder = "in"\npattern = "links-{{night}}.csv"\n{snapshots}\n'
        f'[reader]\nendorser = "source"\nendorsed = "target"\n{extra}\n',
        encoding="utf-8",
    )
    return file


def write_night(folder: Path, night: date, links: Iterable[tuple[str, ...]], *, header: str = "source,target") -> Path:
    """One plain CSV snapshot."""
    path = folder / f"links-{night}.csv"
    path.write_text("\n".join([header, *(",".join(link) for link in sorted(links))]) + "\n", encoding="utf-8")
    return path


def write_gzip(path: Path, text: str) -> Path:
    """A gzip file of some text."""
    path.write_bytes(gzip.compress(text.encode(), mtime=0))
    return path


class MiniWorld:
    """A small network with a strong core and a little honest change every night, the same for the same seed."""

    def __init__(self, seed: int = 7, nodes: int = 120, per_node: int = 5) -> None:
        self.random = random.Random(seed)
        self.names = [f"n{number:03d}.example" for number in range(nodes)]
        self.links: Links = set()
        for position, source in enumerate(self.names):
            for _ in range(per_node):
                target = self.names[int(nodes * self.random.random() ** 2)]
                if target != source:
                    self.links.add((source, target))
            self.links.add((source, self.names[(position + 1) % nodes]))

    def step(self) -> None:
        """One night of change: one link gone, two new."""
        self.links.discard(self.random.choice(sorted(self.links)))
        for _ in range(2):
            source, target = self.random.sample(self.names, 2)
            self.links.add((source, target))

    def write(self, folder: Path, nights: int, *, start: date = FIRST, skip: Iterable[int] = ()) -> list[date]:
        """Write so many nights; those in ``skip`` happen but leave no file."""
        written = []
        for number in range(nights):
            if number:
                self.step()
            if number not in set(skip):
                night = start + timedelta(days=number)
                write_night(folder, night, self.links)
                written.append(night)
        return written


def snapshot_of(
    lists: Mapping[int, Iterable[int] | Mapping[int, float]], day: int, *, fetched: Iterable[int] | None = None
) -> Snapshot:
    """``lists``: source -> its targets, or source -> {target: weight}; ``day`` counts from 2030-01-01."""
    links = sorted((target, source) for source, targets in lists.items() for target in targets)
    weights = [
        float(w)
        for _, w in sorted(((t, s), w) for s, ts in lists.items() if isinstance(ts, Mapping) for t, w in ts.items())
    ]
    return Snapshot(
        night=date(2030, 1, 1) + timedelta(days=day),
        source=np.array([source for _, source in links], dtype=np.int32),
        target=np.array([target for target, _ in links], dtype=np.int32),
        weight=np.array(weights) if weights else None,
        origin=Origin("made.csv", "0" * 64, 1, "csv", len(links)),
        fetched=None if fetched is None else np.array(sorted(fetched), dtype=np.int32),
    )
