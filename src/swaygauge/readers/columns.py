"""Which column of a file plays which role."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from swaygauge.errors import MissingColumn
from swaygauge.readers.options import Column, ReadOptions
from swaygauge.visible import visible


@dataclass(frozen=True)
class Columns:
    """Positions counted from 0."""

    endorser: int
    endorsed: int
    weight: int | None
    count: int  # columns in the file
    names: tuple[str, ...]  # what each used column is called in messages: endorser, endorsed, weight

    @property
    def used(self) -> tuple[int, ...]:
        """The positions that are read: endorser, endorsed and, if there is one, weight."""
        return (self.endorser, self.endorsed) if self.weight is None else (self.endorser, self.endorsed, self.weight)


def find_columns(file: str, header: Sequence[str] | None, options: ReadOptions, *, count: int) -> Columns:
    """Where the configured columns are.

    header: the column names, None when the file has none. Raises MissingColumn naming every column that is not there
    (or is there twice) together with those that are.
    """
    roles = [("endorser", options.endorser), ("endorsed", options.endorsed)]
    if options.weight != "":
        roles.append(("weight", options.weight))
    places, lacking = [], []
    for role, column in roles:
        place = _place(column, header, count)
        if isinstance(place, str):
            lacking.append(f"{role} = {column!r} ({place})")
        else:
            places.append(place)
    if lacking:
        there = f"{count} column(s)" if header is None else ", ".join(f"'{visible(name, limit=60)}'" for name in header)
        hint = ""
        if header and header[0].startswith("#") and not options.comment:
            hint = " If lines that begin with '#' are comments, set reader.comment = '#'."
        raise MissingColumn(
            f"{file}: cannot find {' and '.join(lacking)}. The file has {there}. "
            f"Set reader.endorser, reader.endorsed and reader.weight to its columns.{hint}"
        )
    return Columns(
        endorser=places[0],
        endorsed=places[1],
        weight=places[2] if len(places) == 3 else None,
        count=count,
        names=tuple(f"{role} (column {column!r})" for role, column in roles),
    )


def _place(column: Column, header: Sequence[str] | None, count: int) -> int | str:
    """The position, or why there is none."""
    if isinstance(column, int):
        return column - 1 if 1 <= column <= count else "no such column number"
    if header is None:
        return "the file has no header"
    found = [at for at, name in enumerate(header) if name == column]
    if len(found) == 1:
        return found[0]
    return f"{len(found)} columns have this name" if found else "no such column"
