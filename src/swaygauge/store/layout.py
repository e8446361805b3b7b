"""Where things lie in a workspace, and which words may become part of a path."""

from __future__ import annotations

import re
from datetime import date
from typing import Final

from swaygauge.errors import StoreError

NAME: Final = re.compile(r"[A-Za-z0-9][A-Za-z0-9_-]{0,63}")
KIND: Final = re.compile(r"[a-z][a-z0-9_]{0,31}")
FACT: Final = re.compile(r"[a-z][a-z0-9_.-]{0,63}")
RESERVED: Final = frozenset({"prefect"})  # other folders of a workspace

CATALOG: Final = "catalog.sqlite"
NAMES: Final = "names"  # folder of the name table inside a network
STUDIES: Final = "studies"  # folder of what people asked to be studied; no night rests on it
SCORES: Final = "scores"  # the kinds of part that the reading side knows
MOVES: Final = "moves"


def check_name(network: str) -> str:
    """The network's name, if it can be a folder. Raises StoreError."""
    if not NAME.fullmatch(network) or network.lower() in RESERVED:
        raise StoreError(
            f"a network cannot be called {network[:80]!r}: expected letters, digits, - and _ (at most 64, the first a "
            f"letter or digit) and none of {sorted(RESERVED)}. Give it another name in its settings."
        )
    return network


def check_kind(kind: str, score: str = "") -> None:
    """Raises StoreError unless kind and score can be part of a path."""
    for what, word in (("kind", kind), ("score", score)):
        if not KIND.fullmatch(word) and not (what == "score" and word == ""):
            raise StoreError(
                f"a {what} of part cannot be called {word[:80]!r}: expected lower-case letters, digits and _."
            )


def check_fact(name: str) -> None:
    """Raises StoreError unless the name of a fact is a plain word."""
    if not FACT.fullmatch(name):
        raise StoreError(f"a fact cannot be called {name[:80]!r}: expected lower-case letters, digits and _ . - .")


def part_folder(network: str, night: date, kind: str, score: str) -> str:
    """Folder of a part, relative to the workspace."""
    by_score = f"/score={score}" if score else ""
    return f"{network}/{kind}{by_score}/night={night.isoformat()}"


def part_path(network: str, night: date, kind: str, score: str, sha256: str) -> str:
    """Path of a part, relative to the workspace: the content names the file."""
    return f"{part_folder(network, night, kind, score)}/{sha256[:16]}.parquet"


def name_part_path(network: str, first: int, sha256: str) -> str:
    """Path of the part of the name table that starts at id ``first``, relative to the workspace."""
    return f"{network}/{NAMES}/names-{first}-{sha256[:16]}.parquet"
