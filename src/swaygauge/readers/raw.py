"""Links as a file states them, with names: what a reader hands on, and names to integers."""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from swaygauge.readers.faults import Faults
from swaygauge.records import Floats, Ids, Origin, frozen


@dataclass(frozen=True)
class Rows:
    """The good rows of one file in file order, and what became of the others."""

    endorser: pa.ChunkedArray  # (rows,) string, never null, never empty
    endorsed: pa.ChunkedArray  # (rows,) string
    weight: Floats | None  # (rows,) finite and > 0
    faults: Faults
    sha256: str  # of the stored file
    size: int  # bytes of the stored file


@dataclass(frozen=True)
class RawLinks:
    """One file's links. A row says: names[source_code] endorses names[target_code]. Rows keep the file's order.

    ``names`` is sorted by its UTF-8 bytes, so a table that gives new names their ids in this order gives the same ids
    for any order of rows.
    """

    names: pa.StringArray  # (k,) distinct, sorted by UTF-8 bytes
    source_code: Ids  # (rows,) positions in names
    target_code: Ids  # (rows,)
    weight: Floats | None  # (rows,) finite and > 0; None when links are unweighted
    origin: Origin


def encode(rows: Rows, origin: Origin) -> RawLinks:
    """Names to integers. One pass over each column's names, both columns at once."""
    with ThreadPoolExecutor(2) as threads:
        source, target = threads.map(_dictionary, (rows.endorser, rows.endorsed))
    joined = pa.concat_arrays([source[0], target[0]]).dictionary_encode()
    place = joined.indices.to_numpy()  # of each column's distinct names among all distinct names
    order = pc.sort_indices(joined.dictionary).to_numpy()
    rank = np.empty(len(order), np.int32)
    rank[order] = np.arange(len(order), dtype=np.int32)
    cut = len(source[0])
    return RawLinks(
        names=joined.dictionary.take(pa.array(order)),
        source_code=frozen(rank[place[:cut]][source[1]]),
        target_code=frozen(rank[place[cut:]][target[1]]),
        weight=rows.weight,
        origin=origin,
    )


def _dictionary(column: pa.ChunkedArray) -> tuple[pa.StringArray, Ids]:
    encoded = column.dictionary_encode()
    names = encoded.chunk(0).dictionary if encoded.num_chunks else pa.array([], pa.string())
    codes = [chunk.indices.to_numpy() for chunk in encoded.chunks]
    return names, np.concatenate(codes) if codes else np.empty(0, np.int32)


def renamed(raw: RawLinks, names: Sequence[str]) -> RawLinks:
    """The same rows under other names; names that become equal become one.

    names: (k,) the new name of each of ``raw.names``.
    """
    joined = pa.array(names, pa.string()).dictionary_encode()
    order = pc.sort_indices(joined.dictionary).to_numpy()
    rank = np.empty(len(order), np.int32)
    rank[order] = np.arange(len(order), dtype=np.int32)
    code = rank[joined.indices.to_numpy()]
    return dataclasses.replace(
        raw,
        names=joined.dictionary.take(pa.array(order)),
        source_code=frozen(code[raw.source_code]),
        target_code=frozen(code[raw.target_code]),
    )
