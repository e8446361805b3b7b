"""What makes a row no link, and the tally of such rows. The words here are the ones a person reads."""

from __future__ import annotations

import math
import re
from collections import Counter

from swaygauge.visible import visible

SAMPLES = 100  # bad rows that are described one by one; the rest is counted

COLUMNS = "wrong number of columns"
QUOTING = "broken quoting"
EMPTY = "empty name"
LONG = "name too long"
ENCODING = "name not UTF-8"
NUL = "NUL in name"
WEIGHT = "weight not a number"
INFINITE = "weight not finite"
NOT_POSITIVE = "weight not above zero"

# What pyarrow's cast from text to float64 takes, too; the tests hold the two against one another.
NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")

Fault = tuple[str, str]  # (reason, the sentence that says what was found and what was expected)


class Faults:
    """Bad rows: all of them counted by reason, the first hundred described."""

    def __init__(self) -> None:
        self.counts: Counter[str] = Counter()
        self.samples: list[str] = []

    def add(self, where: str, fault: Fault, *, rows: int = 1) -> None:
        """``where`` is "line 418" or "row 418"; ``rows``: how many rows the fault cost."""
        reason, sentence = fault
        self.counts[reason] += rows
        if len(self.samples) < SAMPLES:
            self.samples.append(f"{where}: {sentence}")

    @property
    def total(self) -> int:
        return self.counts.total()


def name_fault(column: str, name: str | None, *, limit: int) -> Fault | None:
    """Why this is no name; None when it is one. Undecodable bytes are surrogates U+DC80..U+DCFF in ``name``.

    Any characters may stand in a name, spaces and controls too, except NUL, which no terminal, database or C library
    carries faithfully.
    """
    if not name:
        return EMPTY, f"{column} is empty; expected a name"
    if name.isascii() and len(name) <= limit and "\0" not in name:
        return None
    try:
        size = len(name.encode())
    except UnicodeEncodeError:
        return ENCODING, f"{column} must be UTF-8, got {quoted(name)}"
    if size > limit:
        return LONG, f"{column} is {size:,} bytes long, at most {limit:,} are allowed (max_name_bytes): {quoted(name)}"
    if "\0" in name:
        return NUL, f"{column} must not hold a NUL character, got {quoted(name)}"
    return None


def weight(column: str, text: str) -> float | Fault:
    """The weight that this text states: a finite number above zero in plain digits. Or why it is none."""
    if NUMBER.fullmatch(text):
        value = float(text)
        return value_fault(column, value, text) or value
    unbounded = text.strip().lower().lstrip("+-") in ("nan", "inf", "infinity")
    return INFINITE if unbounded else WEIGHT, f"{column} must be a finite number > 0, got {quoted(text)}"


def value_fault(column: str, value: float | None, text: str = "") -> Fault | None:
    """Why this number is no weight; None when it is finite and above zero."""
    if value is None:
        return WEIGHT, f"{column} is missing; expected a finite number > 0"
    if 0 < value < math.inf:
        return None
    reason = NOT_POSITIVE if math.isfinite(value) else INFINITE
    return reason, f"{column} must be a finite number > 0, got {quoted(text or str(value))}"


def columns_fault(fields: list[str], expected: int, hint: str = "") -> Fault:
    """The row has more or fewer fields than the file has columns."""
    return COLUMNS, f"expected {expected} columns, got {len(fields)}: {quoted(','.join(fields))}{hint}"


def quoting_fault(why: str, text: str) -> Fault:
    """A quote that opens and never closes, or text behind a closing quote: where the row ends is not known."""
    return QUOTING, f"{why}: {quoted(text)}"


def quoted(text: str) -> str:
    """Text of a file as a message shows it: nothing invisible, not too long."""
    # undecodable bytes are shown as the bytes they are
    plain = "".join(f"\\x{ord(char) - 0xDC00:02x}" if "\udc80" <= char <= "\udcff" else char for char in text[:200])
    return f"'{visible(plain, limit=60)}'" + (f" ({len(text):,} characters)" if len(text) > 200 else "")
