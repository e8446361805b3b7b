"""A record of ``records`` as what the store keeps of it: its arrays become columns, the rest becomes one JSON fact.

The fields' declared types say how to put it together again, so a new record type needs no line here. The field ``ids``
is the column ``id``, as it is asked for in SQL. Floats that JSON has no number for are kept as text ("nan", "inf").
"""

from __future__ import annotations

import dataclasses
import math
import types
import typing
from collections.abc import Mapping
from datetime import date
from functools import cache
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray

from swaygauge.errors import Damaged

Record = TypeVar("Record")


def take_apart(record: Any) -> tuple[dict[str, NDArray[Any]], dict[str, Any]]:
    """The array fields that are there, and the other fields as JSON values."""
    arrays, rest = {}, {}
    for item in dataclasses.fields(record):
        value = getattr(record, item.name)
        if isinstance(value, np.ndarray):
            arrays[_column(item.name)] = value
        else:
            rest[item.name] = _to_json(value)
    return arrays, rest


@cache
def _types_of(cls: Any) -> dict[str, Any]:
    return typing.get_type_hints(cls)


def put_together(cls: type[Record], arrays: Mapping[str, NDArray[Any]], rest: Mapping[str, Any]) -> Record:
    """The record that was taken apart. Raises Damaged when a field without a default is missing."""
    hints = _types_of(typing.cast(Any, cls))
    values: dict[str, Any] = {}
    for item in dataclasses.fields(cls):  # type: ignore[arg-type]  # a record is a dataclass; TypeVar bounds cannot say so
        if _column(item.name) in arrays:
            values[item.name] = arrays[_column(item.name)]
        elif item.name in rest:
            values[item.name] = _from_json(hints[item.name], rest[item.name])
    try:
        return cls(**values)
    except TypeError as error:
        raise Damaged(f"{cls.__name__} cannot be read back: {error}. Run the night again.") from None


def _column(field: str) -> str:
    return "id" if field == "ids" else field


def _to_json(value: Any) -> Any:
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {item.name: _to_json(getattr(value, item.name)) for item in dataclasses.fields(value)}
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float) and not math.isfinite(value):
        return repr(value)
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, Mapping):
        return {str(key): _to_json(item) for key, item in value.items()}
    if isinstance(value, tuple | list):
        return [_to_json(item) for item in value]
    return value


def _from_json(hint: Any, value: Any) -> Any:
    """A JSON value as the declared type: dates, tuples and records in place of text, lists and tables."""
    if value is None:
        return None
    inner = typing.get_args(hint)
    if isinstance(hint, types.UnionType) or typing.get_origin(hint) is typing.Union:
        return _from_json(next(item for item in inner if item is not type(None)), value)
    if typing.get_origin(hint) is tuple:
        each = inner[:1] * len(value) if inner[1:] == (Ellipsis,) else inner
        return tuple(_from_json(item, part) for item, part in zip(each, value, strict=True))
    if dataclasses.is_dataclass(hint) and isinstance(hint, type):
        return put_together(hint, {}, value)
    if hint is date:
        return date.fromisoformat(value)
    return float(value) if hint is float else value
