"""How the place of a field is written: ``predictors[2].range``, ``missing_data.fill."fan hours"``."""

from __future__ import annotations

import json
import re
from collections.abc import Iterable, Mapping

_NEEDS_QUOTES = re.compile(r'[.\[\]"\s]|^$')


def keyed(place: str, key: str) -> str:
    """The place of a key of a mapping; a key with dots, brackets or blanks stands in quotes, on one line."""
    shown = json.dumps(key, ensure_ascii=False) if _NEEDS_QUOTES.search(key) else key
    return f"{place}.{shown}" if place else shown


def place_of(steps: Iterable[str | int]) -> str:
    """The place that keys and positions lead to."""
    place = ""
    for step in steps:
        place = f"{place}[{step}]" if isinstance(step, int) else keyed(place, step)
    return place


def enclosing(place: str) -> str:
    """The place one step out; empty for a top one."""
    if place.endswith("]"):
        return place[: place.rindex("[")]
    if place.endswith('"') and '."' in place:
        return place[: place.rindex('."')]
    return place.rpartition(".")[0]


def line_of(place: str, lines: Mapping[str, int]) -> int | None:
    """Line of a place, or of the nearest one around it that stands in the file; None without a file."""
    while place:
        if place in lines:
            return lines[place]
        place = enclosing(place)
    return 1 if lines else None
