"""How the terminal is written to. Names are other people's input: everything printed passes through visible()."""

from __future__ import annotations

import json
import sys
from collections.abc import Iterable, Sequence
from typing import Any

from swaygauge.visible import visible

UNBOUNDED = 10_000  # columns; wider than any row


def say(text: str = "") -> None:
    """One line (or several) of our own words."""
    sys.stdout.write(text + "\n")


def complain(text: str) -> None:
    """A message for people, on standard error."""
    sys.stderr.write(text + "\n")


def print_json(value: Any) -> None:
    """One JSON document; dates as ISO text, names exactly as they arrived, escaped so that no terminal acts on them."""
    say(json.dumps(value, default=str, indent=2))


def print_table(heads: Sequence[str], rows: Iterable[Sequence[Any]], *, right: str = "") -> None:
    """Columns of text. ``right`` has an 'r' at the position of each column that is set to the right."""
    from rich import box
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False)
    for position, head in enumerate(heads):
        to_right = position < len(right) and right[position] == "r"
        fixed = to_right or position < len(heads) - 1
        table.add_column(Text(head), justify="right" if to_right else "left", overflow="fold", no_wrap=fixed)
    for row in rows:
        table.add_row(*(Text(visible(str(cell))) for cell in row))
    # a pipe or a file gets one line a row, whatever its length; a terminal gets what fits
    Console(highlight=False, width=None if sys.stdout.isatty() else UNBOUNDED).print(table)
