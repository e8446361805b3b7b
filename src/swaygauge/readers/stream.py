"""Bytes of a file as they are read: decompressed, counted and hashed on the way, so that nothing is read twice."""

from __future__ import annotations

import codecs
import hashlib
import io
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import BinaryIO

import pyarrow as pa

from swaygauge.errors import NoLinks, UnreadableFile

CODECS = {".gz": "gzip", ".zst": "zstd"}
MAGIC = {b"\x1f\x8b": "gzip", b"\x28\xb5\x2f\xfd": "zstd"}
PIECE = 1 << 20


class _Hashing:
    """A file that digests what is read from it. Read by one thread at a time."""

    closed = False

    def __init__(self, file: BinaryIO) -> None:
        self._file = file
        self.digest = hashlib.sha256()
        self.size = 0

    def read(self, size: int = -1) -> bytes:
        piece = self._file.read(size)
        self.digest.update(piece)
        self.size += len(piece)
        return piece

    def close(self) -> None:
        self.closed = True


class Source(io.RawIOBase):
    """The decompressed bytes of one file. After the last byte, ``sha256`` and ``size`` are those of the stored file."""

    def __init__(self, path: Path, file: BinaryIO) -> None:
        super().__init__()
        self.path = path
        self._raw = _Hashing(file)
        codec = CODECS.get(path.suffix)
        stream = pa.PythonFile(self._raw, mode="r")
        self._stream = pa.CompressedInputStream(stream, codec) if codec else self._raw
        self._returned = b""

    def readable(self) -> bool:
        return True

    def readinto(self, buffer: memoryview) -> int:  # type: ignore[override]  # typeshed: WriteableBuffer, no len()
        piece = self.piece(len(buffer))
        buffer[: len(piece)] = piece
        return len(piece)

    def piece(self, size: int = PIECE) -> bytes:
        """The next bytes, at most ``size``; empty at the end. Raises UnreadableFile for damaged compression."""
        if self._returned:
            piece, self._returned = self._returned[:size], self._returned[size:]
            return piece
        try:
            return bytes(self._stream.read(size))
        except OSError as error:
            raise UnreadableFile(
                f"{self.path.name}: expected complete {CODECS.get(self.path.suffix, 'readable')} data, but reading "
                f"failed after {self._raw.size:,} bytes ({error}). Was it still being written? Fetch the file again."
            ) from None

    def whole_lines(self, size: int = PIECE) -> bytes:
        """The next bytes, about ``size`` or a longer line; they end behind a line feed, or at the end of the file."""
        pieces: list[bytes] = []
        while piece := self.piece(size):
            cut = piece.rfind(b"\n") + 1
            if cut:
                self.take_back(piece[cut:])
                return b"".join((*pieces, piece[:cut]))
            pieces.append(piece)
        return b"".join(pieces)

    def take_back(self, piece: bytes) -> None:
        """Puts bytes in front of what is still to be read."""
        self._returned = piece + self._returned

    @property
    def sha256(self) -> str:
        return self._raw.digest.hexdigest()

    @property
    def size(self) -> int:
        return self._raw.size


def check_file(path: Path) -> None:
    """Whether there is something to read at all, compressed the way its name says.

    Raises UnreadableFile, and NoLinks for a file without a single byte.
    """
    if path.is_dir():
        raise UnreadableFile(f"{path}: is a folder; expected one file. Give the path of the file itself.")
    try:
        with path.open("rb") as file:
            start = file.read(4)
    except FileNotFoundError:
        raise UnreadableFile(f"{path}: no such file.") from None
    except OSError as error:
        raise UnreadableFile(f"{path}: cannot be opened ({error.strerror}).") from None
    if not start:
        raise NoLinks(f"{path.name}: the file is empty (0 bytes); expected at least one link. Fetch the file again.")
    stated = CODECS.get(path.suffix, "no")
    found = next((codec for magic, codec in MAGIC.items() if start.startswith(magic)), "no")
    if stated != found:
        raise UnreadableFile(
            f"{path.name}: its name promises {stated} compression, its first bytes show {found} compression. "
            f"Rename the file ('' for none, .gz for gzip, .zst for zstd) or fetch it again."
        )


@contextmanager
def open_source(path: Path) -> Iterator[Source]:
    """The decompressed bytes of a text file, without a byte order mark. Raises what :func:`check_file` raises, and
    UnreadableFile for UTF-16."""
    check_file(path)
    with path.open("rb") as file, Source(path, file) as source:
        start = source.piece()
        if start[:2] in (codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE):
            raise UnreadableFile(f"{path.name}: the file is UTF-16 text; expected UTF-8. Save it as UTF-8.")
        source.take_back(start.removeprefix(codecs.BOM_UTF8))
        yield source
