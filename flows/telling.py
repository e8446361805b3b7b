"""Who is told of each night as it ends: a terminal, when a person started the flow; nobody, on a schedule."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from contextvars import ContextVar

from swaygauge.night import Outcome

_listener: ContextVar[Callable[[Outcome], None] | None] = ContextVar("listener", default=None)


@contextmanager
def telling(listener: Callable[[Outcome], None] | None) -> Iterator[None]:
    """Within this block, flows report each night to ``listener``."""
    token = _listener.set(listener)
    try:
        yield
    finally:
        _listener.reset(token)


def tell(outcome: Outcome) -> None:
    """Pass an outcome on, if somebody listens."""
    listener = _listener.get()
    if listener is not None:
        listener(outcome)
