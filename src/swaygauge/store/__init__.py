"""The workspace: a catalog of small facts (SQLAlchemy) and series in Parquet (read through DuckDB).

Names are resolved on first use, so that a terminal command can read without loading what only writing needs.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from swaygauge.store.reading import Reader
    from swaygauge.store.writing import Store

__all__ = ["Reader", "Store"]


def __getattr__(name: str) -> Any:
    if name == "Reader":
        from swaygauge.store.reading import Reader

        return Reader
    if name == "Store":
        from swaygauge.store.writing import Store

        return Store
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
