"""Data made in memory, in the form that a file is read into."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from beforehand.plan.complaint import Complaint
from beforehand.plan.numbers import shown
from beforehand.plan.places import keyed
from beforehand.plan.yaml_words import MOST_DEPTH, STRANGE_IN_VALUE, TOO_DEEP


def as_file_data(value: Any, found: list[Complaint], place: str = "", depth: int = 0) -> Any:
    """Dicts with text keys, tuples, and single values as they are.

    Parameters
    ----------
    value : object
        Mappings and lists of any kind, and single values.
    found : list of Complaint
        Takes what no file could hold: keys that are no text, control characters, too deep a nesting.
    place : str
        Of the value.
    depth : int
        Mappings and lists around the value.
    """
    if depth > MOST_DEPTH:
        found.append(Complaint(place, TOO_DEEP, "depth"))
        return None
    if isinstance(value, Mapping):
        data: dict[str, Any] = {}
        for key, item in value.items():
            if isinstance(key, str) and not STRANGE_IN_VALUE.search(key):
                data[str(key)] = as_file_data(item, found, keyed(place, key), depth + 1)
            else:
                found.append(Complaint(place, f"has the key {shown(key)}; a key is text", "key"))
        return data
    if isinstance(value, tuple | list):
        return tuple(
            as_file_data(item, found, f"{place}[{number}]", depth + 1) for number, item in enumerate(value)
        )
    if isinstance(value, str) and STRANGE_IN_VALUE.search(value):
        found.append(Complaint(place, "has a control character in its text", "character"))
    return value
