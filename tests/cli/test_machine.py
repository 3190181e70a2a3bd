from __future__ import annotations

import json
import math
from dataclasses import dataclass

import pytest

from beforehand.cli.machine import json_text, plain
from beforehand.lock import Lock


@dataclass(frozen=True)
class Pair:
    """A record of the program's own."""

    first: float
    second: tuple[object, ...]


def test_records_become_plain_data_with_their_own_keys() -> None:
    """Dataclasses, mappings and tuples, nested."""
    assert plain({"a": Pair(1.5, (True, None, "x", 3))}) == {
        "a": {"first": 1.5, "second": [True, None, "x", 3]}
    }


def test_what_is_not_a_finite_number_is_null() -> None:
    """NaN and infinity are no JSON and never printed."""
    assert json.loads(json_text([math.nan, math.inf, -math.inf, 0.1])) == [None, None, None, 0.1]


def test_text_keeps_its_script() -> None:
    """Names can be read and searched in the output."""
    assert json_text({"größe": "°C"}) == '{\n  "größe": "°C"\n}\n'


def test_numbers_keep_every_digit() -> None:
    """What is read back is the same double."""
    values = [0.1 + 0.2, 1e-300, 123456789.123456789]
    assert json.loads(json_text(values)) == values


def test_a_lock_is_plain_data_in_its_own_order(lock: Lock) -> None:
    """Keys in the order of the file."""
    assert list(plain(lock)) == list(Lock.model_fields)


def test_what_has_no_json_is_a_bug() -> None:
    """Nothing is turned into text by accident."""
    with pytest.raises(TypeError) as caught:
        plain(object())
    assert str(caught.value) == "no JSON for object"
