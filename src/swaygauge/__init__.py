"""swaygauge: recurring influence monitoring on directed networks. See README.md.

For notebooks, the names of :mod:`swaygauge.notebook` can be used from here: ``swaygauge.katz(network)``. They load when
first asked for, so that importing the package stays cheap.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from swaygauge.notebook import (
        Comparison,
        Network,
        Scores,
        compare,
        eigenvector,
        fairshare,
        katz,
        lambda_bounds,
        leaks,
    )

__version__ = "0.1.0"

__all__ = [
    "Comparison",
    "Network",
    "Scores",
    "compare",
    "eigenvector",
    "fairshare",
    "katz",
    "lambda_bounds",
    "leaks",
]


def __getattr__(name: str) -> Any:
    if name in __all__:
        return getattr(import_module("swaygauge.notebook"), name)
    raise AttributeError(f"module 'swaygauge' has no attribute {name!r}")
