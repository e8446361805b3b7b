"""Snapshot files -> links with names. A new format is one function and one line in READERS."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from pathlib import Path

import numpy as np

from swaygauge.errors import BadRows, ConfigError, NoLinks
from swaygauge.readers.csv_file import read_csv
from swaygauge.readers.options import ReadOptions, problems
from swaygauge.readers.parquet_file import read_parquet
from swaygauge.readers.raw import RawLinks, Rows, encode, renamed
from swaygauge.records import Origin, frozen

Reader = Callable[[Path, ReadOptions], Rows]

READERS: dict[str, Reader] = {
    "csv": read_csv,
    "tsv": read_csv,
    "parquet": read_parquet,
}


def read_links(path: Path, options: ReadOptions) -> RawLinks:
    """The links that a snapshot file states, with distinct sorted names and integer codes.

    Nothing is repaired: names keep every character, rows that are no links are refused or, with
    ``options.bad_rows = "drop"``, left out and counted by reason.

    Raises ConfigError (contradicting options), UnreadableFile, MissingColumn, BadRows (refuse; after the whole file was
    judged), NoLinks.
    """
    contradictions = problems(options)
    if contradictions:
        raise ConfigError("reader", contradictions)
    rows = READERS[options.format](path, options)
    tally = rows.faults
    if tally.total and options.bad_rows == "refuse":
        raise BadRows(path.name, tally.total, tally.samples)
    if not len(rows.endorser):
        left_out = f"; all {tally.total} row(s) were dropped as bad: {'; '.join(tally.samples[:5])}" * bool(tally.total)
        raise NoLinks(f"{path.name}: the file holds no link{left_out}. Expected at least one; fetch the file again.")
    origin = Origin(
        file=path.name,
        sha256=rows.sha256,
        size=rows.size,
        reader=options.format,
        rows=len(rows.endorser) + tally.total,
        dropped=tuple(sorted(tally.counts.items())),
        dropped_samples=tuple(tally.samples),
    )
    if options.duplicates == "count":
        rows = dataclasses.replace(rows, weight=frozen(np.ones(len(rows.endorser))))
    raw = encode(rows, origin)
    if options.normalise_hosts:
        from swaygauge.readers.hosts import normalise_hosts  # needs the idna package, of the pipeline extra

        raw = normalise_hosts(raw)
    return raw


__all__ = ["READERS", "RawLinks", "ReadOptions", "Reader", "read_links", "renamed"]
