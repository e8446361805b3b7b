"""What may accompany a snapshot: the sources that were fetched, and each node's own importance."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from swaygauge.readers import faults
from swaygauge.readers.faults import Faults
from swaygauge.readers.lines import open_text
from swaygauge.readers.stream import open_source
from swaygauge.readers.tables import COMMENT, read_table, refuse_faults

REPEATED = "name given twice"


@dataclass(frozen=True)
class NameList:
    """Names out of a file."""

    names: tuple[str, ...]  # distinct, sorted by UTF-8 bytes
    repeated: int  # lines that gave a name again
    sha256: str
    size: int


@dataclass(frozen=True)
class ValueList:
    """A number for each of some names."""

    values: dict[str, float]  # finite and > 0
    sha256: str
    size: int


def read_names(path: Path, *, max_name_bytes: int = 2048, normalise: bool = False) -> NameList:
    """The fetched sources: one name a line, exactly as it stands there, no quoting. Blank lines and lines that begin
    with '#' are no names. Plain, gzip or zstd.

    normalise: the names are host names (``ReadOptions.normalise_hosts``). A file of comments alone says that no source
    was fetched. Raises UnreadableFile, BadRows (every bad line), NoLinks (no byte at all).
    """
    tally = Faults()
    found: list[str] = []
    with open_source(path) as source:
        for number, line in enumerate(open_text(source), start=1):
            name = line.rstrip("\r\n")
            if not name or name.startswith(COMMENT):
                continue
            fault = faults.name_fault("the name", name, limit=max_name_bytes)
            if fault is None:
                found.append(_spelling(name, normalise))
            else:
                tally.add(f"line {number}", fault)
        refuse_faults(path, tally)
        names = sorted(set(found))
        return NameList(tuple(names), len(found) - len(names), source.sha256, source.size)


def read_values(path: Path, *, max_name_bytes: int = 2048, normalise: bool = False) -> ValueList:
    """Each node's own importance (beta): CSV with the header ``name,value``, values finite and > 0.

    normalise: the names are host names (``ReadOptions.normalise_hosts``). Raises UnreadableFile, MissingColumn,
    BadRows (every bad line, names given twice included).
    """
    table = read_table(path, ("name", "value"))
    values: dict[str, float] = {}
    lines: dict[str, int] = {}
    for line, (name, text) in table.rows:
        fault = faults.name_fault("name", name, limit=max_name_bytes)
        spelling = name if fault else _spelling(name, normalise)
        if fault is None and spelling in lines:
            fault = REPEATED, f"expected each name once, {faults.quoted(name)} already stands on line {lines[spelling]}"
        value = fault or faults.weight("value", text)
        if isinstance(value, float):
            lines[spelling], values[spelling] = line, value
        else:
            table.faults.add(f"line {line}", value)
    refuse_faults(path, table.faults)
    return ValueList(values, table.sha256, table.size)


def _spelling(name: str, normalise: bool) -> str:
    if not normalise:
        return name
    from swaygauge.readers.hosts import normalise_host  # needs the idna package, of the pipeline extra

    return normalise_host(name)
