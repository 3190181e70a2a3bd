"""Values of a plan as they stand in a sentence: short, on one line, as a person wrote them."""

from __future__ import annotations

import datetime
import json
import re
from collections.abc import Mapping
from typing import Any

from beforehand.plan import Limit
from beforehand.plan.block import Block
from beforehand.plan.numbers import NUMBER, number_text

# So much of a long value is repeated; the plans themselves have the rest.
LONGEST = 60
# So many items of a list are named.
MOST_NAMED = 6

_PLAIN_NAME = re.compile(r"[^\[\]\"\x00-\x1f\x7f-\x9f\u2028\u2029]+")
# A number of more decimals is told as it is, not filled up to those of its neighbour.
_MOST_DECIMALS = 6


def inside(place: str, name: str) -> str:
    """The place of a named item of a list: ``predictors[load]``; odd names stand in quotes."""
    return f"{place}[{name if _PLAIN_NAME.fullmatch(name) else json.dumps(name, ensure_ascii=False)}]"


def told(value: Any) -> str:
    """One value for a sentence, cut where it is long."""
    return _cut(_whole(value), 0)


def told_pair(old: Any, new: Any) -> tuple[str, str]:
    """Two values side by side; numbers with the same decimals, long texts from where they part."""
    if _is_number(old) and _is_number(new):
        return _aligned(number_text(old), number_text(new))
    before, now = _whole(old), _whole(new)
    if max(len(before), len(now)) <= LONGEST:
        return before, now
    shared = next(
        (place for place, (a, b) in enumerate(zip(before, now, strict=False)) if a != b),
        min(len(before), len(now)),
    )
    start = before.rfind(" ", 0, max(0, shared - LONGEST // 3)) + 1
    return _cut(before, start), _cut(now, start)


def listed(items: list[Any]) -> str:
    """Items in a sentence: ``a, b and c``; the last of many are only counted."""
    names = [told(item) for item in items[:MOST_NAMED]]
    if len(items) > MOST_NAMED:
        return f"{', '.join(names)} and {len(items) - MOST_NAMED:,} more"
    return " and ".join([", ".join(names[:-1]), names[-1]] if len(names) > 1 else names)


def _cut(text: str, start: int) -> str:
    """As much of a text as is repeated, from a place on."""
    text = f"…{text[start:]}" if start else text
    return text if len(text) <= LONGEST else f"{text[: LONGEST - 1].rstrip()}…"


def _whole(value: Any) -> str:
    """One value, not cut."""
    if value is None:
        return "none"
    if isinstance(value, bool):
        return "true" if value else "false"
    if _is_number(value):
        return number_text(value)
    if isinstance(value, Limit):
        return value.text
    if isinstance(value, datetime.date):
        return value.isoformat()
    if isinstance(value, Block):
        fields = type(value).model_fields
        return _whole({field.alias or name: getattr(value, name) for name, field in fields.items()})
    if isinstance(value, Mapping):
        given = {key: item for key, item in value.items() if item is not None and item != ()}
        return "{" + ", ".join(f"{key}: {_whole(item)}" for key, item in given.items()) + "}"
    if isinstance(value, tuple | list):
        return "[" + ", ".join("null" if item is None else _whole(item) for item in value) + "]"
    text = _on_one_line(str(value))
    # Text that would read as a number, or as nothing, is told from one by its quotes.
    return json.dumps(text, ensure_ascii=False) if not text.strip() or NUMBER.fullmatch(text) else text


def _on_one_line(text: str) -> str:
    """The text without line ends."""
    return re.sub(r"\s", " ", text)


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _aligned(old: str, new: str) -> tuple[str, str]:
    """Two plain decimal numbers with the same decimals: ``0.05`` beside ``0.10``."""
    texts = (old, new)
    decimals = [len(text.partition(".")[2]) for text in texts]
    most = max(decimals)
    if any("e" in text for text in texts) or not 0 < most <= _MOST_DECIMALS:
        return old, new
    first, second = (f"{text}{'' if '.' in text else '.'}" for text in texts)
    return first + "0" * (most - decimals[0]), second + "0" * (most - decimals[1])
