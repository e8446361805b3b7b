"""CSV records with the line that each begins on, one at a time. Python's csv module does the parsing."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator
from typing import Literal, NamedTuple

from swaygauge.readers.stream import PIECE, Source


class Record(NamedTuple):
    """One CSV record."""

    line: int  # the line it begins on, counted from 1
    lines: int  # how many lines it spans
    fields: list[str]
    broken: str = ""  # why its quoting cannot be followed; then ``fields`` holds the first line as it stands

    @property
    def where(self) -> str:
        """In the words of a message."""
        return f"line {self.line}" if self.lines == 1 else f"lines {self.line} to {self.line + self.lines - 1}"


def open_text(stream: Source | io.BytesIO) -> io.TextIOWrapper:
    """Text that keeps its line ends; bytes that are not UTF-8 become lone surrogates."""
    buffered = io.BufferedReader(stream, buffer_size=PIECE)
    return io.TextIOWrapper(buffered, encoding="utf-8", errors="surrogateescape", newline="")


class _Lines(Iterator[str]):
    """Feeds the csv reader; passes over comment lines where a record could begin."""

    def __init__(self, text: io.TextIOWrapper, comment: str, passed: int) -> None:
        self._text = text
        self._comment = comment
        self.number = passed
        self.taken: list[str] = []  # lines of the current record

    def __next__(self) -> str:
        while True:
            line = next(self._text)
            self.number += 1
            if self.taken or not (self._comment and line.startswith(self._comment)):
                self.taken.append(line)
                return line


def read_records(
    text: io.TextIOWrapper, *, delimiter: str, quote: str, comment: str, passed: int = 0
) -> Iterator[Record]:
    """The records of a CSV text. Blank lines and comment lines are no records.

    passed: lines of the file in front of the text. Quoting is strict: text behind a closing quote, or a quote that
    never closes, makes a broken record. csv's own limit of 131,072 characters a field bounds how far an open quote can
    reach.
    """
    lines = _Lines(text, comment, passed)
    quoting: Literal[0, 3] = csv.QUOTE_MINIMAL if quote else csv.QUOTE_NONE
    reader = csv.reader(lines, delimiter=delimiter, quotechar=quote or None, quoting=quoting, strict=True)
    taken = lines.taken
    while True:
        taken.clear()
        try:
            fields = next(reader)
        except StopIteration:
            return
        except csv.Error as error:
            yield Record(lines.number - len(taken) + 1, len(taken), [taken[0].rstrip("\r\n")], str(error))
            continue
        if fields:
            yield Record(lines.number - len(taken) + 1, len(taken), fields)
