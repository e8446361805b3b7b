"""A dated table of renames and merges, so that a renamed node keeps its history.

CSV with the header ``old,new,valid_from``: from that night on, ``old`` and ``new`` are one node.

The rule, for the lines with ``valid_from`` <= the night, earliest date first, within a date a chain from its start and
otherwise in the order of the file:

- **rename**: ``new`` was not known before ``valid_from``. It takes over the history (the id) of ``old``.
- **merge**: ``new`` was known, because it was first seen before ``valid_from`` or an earlier line made it so. The
  history that goes on is that of ``new``; ``old`` and whatever was renamed to it point there from now on.
- two old names for one unseen new name: the first line is the rename, the second a merge into it.
- chains resolve: a -> b, later b -> c: all three are a's history.
- a name given back (a -> b, later b -> a) changes only the name that is shown.

A line that is added after its date applies from the next night that is run; ids that ``new`` collected by then stay
its own. Run the nights since ``valid_from`` again to carry the history over them, too.
"""

from __future__ import annotations

import dataclasses
import heapq
from collections import Counter
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from datetime import date
from itertools import groupby
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from swaygauge.readers import faults
from swaygauge.readers.raw import RawLinks, renamed
from swaygauge.readers.tables import read_table, refuse_faults

DATE = "date not real"
SAME = "old and new are the same"
REPEATED = "alias given twice"
CIRCLE = "circle of names"


@dataclass(frozen=True)
class Alias:
    """From ``valid_from`` on, ``old`` is called ``new``."""

    old: str
    new: str
    valid_from: date
    line: int  # where it stands in the file


@dataclass(frozen=True)
class Resolved:
    """What the alias table means on one night. Names that it does not touch are in neither."""

    canonical: dict[str, str]  # name in a file -> the name whose id it has
    shown: dict[str, str]  # the name that has the id -> the newest name, to be shown


def read_aliases(path: Path, *, max_name_bytes: int = 2048, normalise: bool = False) -> tuple[Alias, ...]:
    """The alias table, in the order of the file.

    normalise: the names are host names (``ReadOptions.normalise_hosts``). Raises UnreadableFile, MissingColumn, BadRows
    (every mistake at once: impossible dates, a line given twice, one old name with two new ones on one date, circles
    within a date).
    """
    table = read_table(path, ("old", "new", "valid_from"))
    found = []
    for line, (old, new, text) in table.rows:
        night = _date(text)
        fault = (
            faults.name_fault("old", old, limit=max_name_bytes)
            or faults.name_fault("new", new, limit=max_name_bytes)
            or (None if night else (DATE, f"valid_from must be a date such as 2025-03-09, got {faults.quoted(text)}"))
        )
        if fault is not None or night is None:
            table.faults.add(f"line {line}", fault or (DATE, "valid_from is missing"))
            continue
        if normalise:
            from swaygauge.readers.hosts import normalise_host  # needs the idna package, of the pipeline extra

            old, new = normalise_host(old), normalise_host(new)
        found.append(Alias(old, new, night, line))
    for alias, fault in mistakes(found):
        table.faults.add(f"line {alias.line}", fault)
    refuse_faults(path, table.faults)
    return tuple(found)


def _date(text: str) -> date | None:
    try:
        night = date.fromisoformat(text)
    except ValueError:
        return None
    return night if night.isoformat() == text else None


def mistakes(aliases: Iterable[Alias]) -> list[tuple[Alias, faults.Fault]]:
    """Lines that contradict themselves or one another."""
    found: list[tuple[Alias, faults.Fault]] = []
    earlier: dict[tuple[str, str], Alias] = {}
    renamed_on: dict[str, date] = {}  # old name -> its latest line's night
    for night, lines in groupby(sorted(aliases, key=lambda alias: (alias.valid_from, alias.line)), key=_night):
        by_old: dict[str, Alias] = {}
        for alias in lines:
            old, new = faults.quoted(alias.old), faults.quoted(alias.new)
            other = by_old.setdefault(alias.old, alias)
            before = earlier.get((alias.old, alias.new))
            if alias.old == alias.new:
                found.append((alias, (SAME, f"old and new must differ, got {old} twice")))
            elif other is not alias:
                found.append((alias, (REPEATED, f"{old} already gets a new name on {night}, on line {other.line}")))
            elif before is not None and renamed_on.get(alias.new, date.min) < before.valid_from:
                told = f"{old} is called {new} since {before.valid_from} already, by line {before.line}"
                found.append((alias, (REPEATED, told)))
            earlier.setdefault((alias.old, alias.new), alias)
        renamed_on |= dict.fromkeys(by_old, night)
        for alias in by_old.values():
            if alias.old != alias.new and _leads_back(alias, by_old):
                told = f"{faults.quoted(alias.old)} leads back to itself on {night}; expected a last name"
                found.append((alias, (CIRCLE, told)))
    return found


def _night(alias: Alias) -> date:
    return alias.valid_from


def _leads_back(alias: Alias, by_old: dict[str, Alias]) -> bool:
    name, passed = alias.new, set[str]()
    while name in by_old and name not in passed:
        if name == alias.old:
            return True
        passed.add(name)
        name = by_old[name].new
    return False


def _in_order(aliases: Iterable[Alias]) -> list[Alias]:
    """The lines of one date: each behind those whose new name is its old one, otherwise in the file's order.

    Lines of a circle, which :func:`mistakes` reports, are left out.
    """
    lines = sorted(aliases, key=lambda alias: alias.line)
    behind: dict[str, list[int]] = {}
    waiting: Counter[str] = Counter()  # name -> lines still to come that give it to something
    for at, alias in enumerate(lines):
        behind.setdefault(alias.old, []).append(at)
        waiting[alias.new] += 1
    ready = [at for at, alias in enumerate(lines) if not waiting[alias.old]]  # sorted, so a heap
    done = []
    while ready:
        alias = lines[heapq.heappop(ready)]
        done.append(alias)
        waiting[alias.new] -= 1
        if not waiting[alias.new]:
            for at in behind.get(alias.new, ()):
                heapq.heappush(ready, at)
    return done


def resolve(aliases: Iterable[Alias], night: date, *, first_seen: Callable[[str], date | None]) -> Resolved:
    """What every name in the table means on that night, by the rule above.

    first_seen: the first night on which a name itself was in a snapshot, None when never; ``dict.get`` fits.

    >>> table = [Alias("old.example", "new.example", date(2025, 3, 9), line=2)]
    >>> resolve(table, date(2025, 3, 9), first_seen={"old.example": date(2025, 1, 1)}.get).canonical
    {'new.example': 'old.example'}
    """
    leads_to: dict[str, str] = {}
    shown: dict[str, str] = {}
    met: set[str] = set()  # names of the lines so far

    def root(name: str) -> str:
        while name in leads_to:
            name = leads_to[name]
        return name

    valid = sorted((alias for alias in aliases if alias.valid_from <= night), key=lambda alias: alias.valid_from)
    for valid_from, lines in groupby(valid, key=_night):
        for alias in _in_order(lines):
            first = first_seen(alias.new)
            known = alias.new in met or (first is not None and first < valid_from)
            old, new = root(alias.old), root(alias.new)
            met |= {alias.old, alias.new}
            if old == new:
                shown[new] = alias.new
            elif known:
                leads_to[old] = new
                shown.pop(old, None)
            else:
                leads_to[new] = old
                shown[old] = alias.new
    return Resolved({name: root(name) for name in leads_to}, shown)


def apply_aliases(raw: RawLinks, resolved: Resolved) -> RawLinks:
    """The same links under canonical names; ``origin.aliased`` counts the names that were mapped."""
    touched = pc.is_in(raw.names, value_set=pa.array(list(resolved.canonical), pa.string())).to_numpy(False)
    if not touched.any():
        return raw
    names = raw.names.to_pylist()
    for at in np.flatnonzero(touched):
        names[at] = resolved.canonical[names[at]]
    origin = dataclasses.replace(raw.origin, aliased=int(touched.sum()))
    return dataclasses.replace(renamed(raw, names), origin=origin)
