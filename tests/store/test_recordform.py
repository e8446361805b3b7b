from __future__ import annotations

import dataclasses
import json
import math
import typing
from datetime import date

import numpy as np
import pytest

from swaygauge import records
from swaygauge.errors import Damaged
from swaygauge.store.recordform import put_together, take_apart
from swaygauge.store.rows import canonical_json

NIGHT = date(2031, 3, 1)


def sample(hint: typing.Any) -> typing.Any:
    """Some value of a declared type, never the default one."""
    inner = typing.get_args(hint)
    if hint is date:
        return NIGHT
    if hint is float:
        return 0.1
    if hint is int:
        return 3
    if hint is bool:
        return True
    if hint is str:
        return "caf\u00e9 \u202e"
    if typing.get_origin(hint) is np.ndarray:
        return np.array([1, 2, 2]).astype(typing.get_args(inner[1])[0])
    if typing.get_origin(hint) is tuple:
        return tuple(sample(part) for part in inner if part is not Ellipsis)
    if typing.get_origin(hint) is dict:
        return {"a": [1, {"b": None}]}
    if dataclasses.is_dataclass(hint):
        return make(hint)
    return sample(next(part for part in inner if part is not type(None)))


def make(cls: type) -> typing.Any:
    hints = typing.get_type_hints(cls)
    return cls(**{item.name: sample(hints[item.name]) for item in dataclasses.fields(cls)})


RECORDS = [kind for kind in vars(records).values() if dataclasses.is_dataclass(kind)]


def same(one: typing.Any, two: typing.Any) -> bool:
    if isinstance(one, np.ndarray):
        return one.dtype == two.dtype and one.tobytes() == two.tobytes()
    if dataclasses.is_dataclass(one):
        return type(one) is type(two) and all(
            same(getattr(one, f.name), getattr(two, f.name)) for f in dataclasses.fields(one)
        )
    return type(one) is type(two) and one == two


@pytest.mark.parametrize("cls", RECORDS, ids=lambda cls: cls.__name__)
def test_every_record_comes_back(cls):
    record = make(cls)
    arrays, rest = take_apart(record)
    assert same(put_together(cls, arrays, json.loads(canonical_json(rest))), record)


@pytest.mark.parametrize("cls", RECORDS, ids=lambda cls: cls.__name__)
def test_every_record_comes_back_through_the_store(store, cls):
    record = make(cls)
    store.stage_record("net", NIGHT, kind="thing", record=record, score="katz")
    assert same(store.record(cls, "net", NIGHT, kind="thing", score="katz", staged=True), record)


def test_optional_fields_and_odd_floats_come_back():
    move = dataclasses.replace(make(records.NetworkMove), tau_b=math.nan, overlap=math.inf, turnover=-math.inf)
    arrays, rest = take_apart(move)
    assert arrays == {}
    back = put_together(records.NetworkMove, {}, json.loads(canonical_json(rest)))
    assert math.isnan(back.tau_b)
    assert (back.overlap, back.turnover) == (math.inf, -math.inf)
    origin = records.Origin("a.csv", "00", 1, "csv", 2)
    ids = np.array([1], np.int32)
    snapshot = records.Snapshot(NIGHT, ids, ids, None, origin)
    arrays, rest = take_apart(snapshot)
    assert same(put_together(records.Snapshot, arrays, json.loads(canonical_json(rest))), snapshot)


def test_arrays_of_two_lengths_are_kept_together(store):
    ids = np.arange(3, dtype=np.int32)
    snapshot = records.Snapshot(
        NIGHT, ids, ids, None, records.Origin("a.csv", "00", 1, "csv", 2), fetched=np.arange(2, dtype=np.int32)
    )
    store.stage_record("net", NIGHT, kind="raw", record=snapshot)
    assert same(store.record(records.Snapshot, "net", NIGHT, kind="raw", staged=True), snapshot)


def test_a_missing_field_is_damage():
    with pytest.raises(Damaged, match="Pin cannot be read back"):
        put_together(records.Pin, {}, {"alpha": 0.5})
