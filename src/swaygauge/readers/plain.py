"""Decides, block by block, whether a CSV text is so plain that two parsers cannot read it differently.

What passes: no NUL, no carriage return outside a line end, no comment line, quotes exactly as RFC 4180 section 2 wants
them, no field near csv's limit. Whatever does not pass is no error; it only goes the careful road.
"""

from __future__ import annotations

import codecs

import numpy as np
from numpy.typing import NDArray

LONGEST = 131_072  # csv's own limit of a field, in characters
WINDOW = LONGEST // 2
_LINE_END = np.frombuffer(b"\n", np.uint8)


class Unclean(Exception):
    """The text needs the careful road."""


class Plain:
    """Remembers between the blocks of one text what is needed to judge the next."""

    def __init__(self, *, delimiter: str, quote: str, comment: str) -> None:
        self._quote = quote.encode()
        self._comment = comment.encode()
        self._limits = np.zeros(256, np.bool_)  # which bytes end a field
        self._limits[[ord(delimiter), ord("\n"), ord("\r")]] = True
        self._offset = 0
        self.opened: int | None = None  # where the quoted field that is open begins

    def check(self, block: bytes) -> None:
        """Raises Unclean. block: whole lines; only the last block of a text may lack the line end."""
        if b"\0" in block or (b"\r" in block and block.count(b"\r") != block.count(b"\r\n")):
            raise Unclean
        if self._comment and (block.startswith(self._comment) or b"\n" + self._comment in block):
            raise Unclean
        if not self._offset and block.startswith(codecs.BOM_UTF8):
            raise Unclean  # behind the first row it belongs to a name
        for at in range(0, len(block) - WINDOW, WINDOW):
            if block.find(b"\n", at, at + WINDOW) < 0:
                raise Unclean
        if self._quote and self._quote in block:
            self._check_quotes(np.frombuffer(block, np.uint8))
        self._offset += len(block)

    def _check_quotes(self, text: NDArray[np.uint8]) -> None:
        """Quotes open and close in turn; RFC 4180 wants an opening one at a field's start, a closing one at its end.

        A doubled quote is a closing one followed by an opening one.
        """
        quote = ord(self._quote)
        at = np.flatnonzero(text == quote)
        opens = (np.arange(len(at)) + (self.opened is not None)) % 2 == 0
        edged = np.concatenate((_LINE_END, text, _LINE_END))
        before, after = edged[at], edged[at + 2]
        starts = opens & self._limits[before]
        ends = ~opens & self._limits[after]
        doubled = (opens & (before == quote)) | (~opens & (after == quote))
        if not (starts | ends | doubled).all():
            raise Unclean
        first, last = at[starts] + self._offset, at[ends] + self._offset
        if self.opened is not None:
            first = np.concatenate(([self.opened], first))
        if len(first) - len(last) not in (0, 1) or (last - first[: len(last)] >= LONGEST).any():
            raise Unclean
        self.opened = int(first[-1]) if len(first) > len(last) else None
