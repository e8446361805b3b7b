"""How a snapshot file is read: the options of one network's files."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Literal

from annotated_types import Ge, Le

Format = Literal["csv", "tsv", "parquet"]
Column = str | int

DELIMITERS = {"csv": ",", "tsv": "\t"}


@dataclass(frozen=True)
class ReadOptions:
    """Which file format, which column endorses which, and what happens to rows that are not links.

    A column is given by its name, or by its number counted from 1 (the only way when there is no header).
    The direction is written here and nowhere else: ``endorser`` -> ``endorsed``.
    """

    format: Format = "csv"  # csv, tsv (plain, .gz or .zst) or parquet
    endorser: Column = "source"  # column of the node that endorses: the follower, the page that links
    endorsed: Column = "target"  # column of the node that is endorsed
    weight: Column = ""  # column of the link's weight, a finite number > 0; "" = links are unweighted
    header: bool = True  # csv, tsv: the first row holds the column names
    delimiter: str = ""  # csv, tsv: one character between fields; "" = comma (csv) or tab (tsv)
    quote: str = '"'  # csv, tsv: the character around fields that hold delimiters or line ends; "" = none
    comment: str = ""  # csv, tsv: lines that begin with this are no rows; "" = there are no such lines
    bad_rows: Literal["refuse", "drop"] = "refuse"  # drop: leave bad rows out, counted by reason
    duplicates: Literal["merge", "count"] = "merge"  # merge: weights add up; count: the number of rows is the weight
    self_links: Literal["leave_out", "keep"] = "leave_out"  # links of a node to itself
    max_name_bytes: Annotated[int, Ge(1), Le(65_536)] = 2048  # longest name, in bytes of UTF-8
    normalise_hosts: bool = False  # names are host names: case, IDNA, default port, RFC 3986 section 6.2


def problems(options: ReadOptions) -> list[str]:
    """Settings that are each fine but contradict one another, as "key: expectation" sentences; empty when usable."""
    found = []
    columns = {"endorser": options.endorser, "endorsed": options.endorsed}
    if options.weight != "":
        columns["weight"] = options.weight
    for key, column in columns.items():
        if isinstance(column, int) and column < 1:
            found.append(f"{key}: expected a column name or a number counted from 1, got {column}")
        elif column == "":
            found.append(f"{key}: expected a column name or a number counted from 1, got ''")
        elif isinstance(column, str) and not options.header and options.format != "parquet":
            found.append(f"{key}: without a header (header = false) give the column's number, got {column!r}")
    if len(set(columns.values())) < len(columns):
        found.append(f"endorser, endorsed, weight: expected different columns, got {list(columns.values())}")
    if options.duplicates == "count" and options.weight != "":
        found.append("duplicates: 'count' makes the weight from the number of rows; leave weight = '' or use 'merge'")
    if options.format == "parquet":
        return found
    for key, value in (("delimiter", options.delimiter), ("quote", options.quote)):
        if len(value) > 1 or not value.isascii() or value in ("\r", "\n", "\0"):
            found.append(f"{key}: expected one ASCII character or '', got {value!r}")
    between = options.delimiter or DELIMITERS[options.format]
    if between == options.quote:
        found.append(f"quote: expected another character than the delimiter, got {options.quote!r} for both")
    if options.comment and (not options.comment.isprintable() or options.comment[0] in (between, options.quote)):
        found.append(f"comment: expected text that no row begins with, such as '#', got {options.comment!r}")
    return found
