"""Parameters of the scores, as the settings file has them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

from annotated_types import Gt, Lt


@dataclass(frozen=True)
class KatzOptions:
    """katz: x = beta + alpha A'x, alpha pinned for an era."""

    share: Annotated[float, Gt(0), Lt(1)] = 0.80  # alpha = share / (upper bound on lambda) on the night it is pinned
    limit: Annotated[float, Gt(0), Lt(1)] = 0.90  # the era ends when alpha * (upper bound on lambda) exceeds this
    acyclic_alpha: Annotated[float, Gt(0)] = 0.5  # alpha of a network without any cycle, where every alpha is legal
    beta: Annotated[float, Gt(0)] = 1.0  # a node's own importance, the unit of the values
    tolerance: Annotated[float, Gt(0), Lt(1)] = 1e-10  # largest |residual| / beta of a finished solve


@dataclass(frozen=True)
class FairshareOptions:
    """fairshare: each source's value, damped by alpha, is split among its targets."""

    alpha: Annotated[float, Gt(0), Lt(1)] = 0.85  # share of a value that is passed on
    beta: Annotated[float, Gt(0)] = 1.0  # a node's own importance, the unit of the values
    tolerance: Annotated[float, Gt(0), Lt(1)] = 1e-10  # largest |residual| / beta of a finished solve
