"""What the models of the plan say of a field: the words it may hold, its default, how that is written."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any, Literal, get_args, get_origin

from pydantic.fields import FieldInfo

from beforehand.plan import Limit
from beforehand.plan.yaml_text import scalar


def words_of(annotation: Any) -> tuple[str, ...]:
    """Words of the literals in an annotation, each once; models in it are left aside."""
    return tuple(dict.fromkeys(_words(annotation)))


def _words(annotation: Any) -> Iterator[str]:
    """Words of the literals in an annotation, in its order."""
    if get_origin(annotation) is Literal:
        yield from (word for word in get_args(annotation) if isinstance(word, str))
        return
    for part in get_args(annotation):
        yield from _words(part)


def default_of(field: FieldInfo) -> Any:
    """What a field holds when it is not written."""
    return field.get_default(call_default_factory=True, validated_data={})


def plain(value: object) -> str:
    """A value as it is written in a plan, on one line."""
    if isinstance(value, Limit):
        return scalar(value.text if value.constant is None else value.constant)
    if isinstance(value, Mapping):
        return "{" + ", ".join(f"{scalar(key)}: {plain(part)}" for key, part in value.items()) + "}"
    if isinstance(value, list | tuple):
        return "[" + ", ".join(plain(part) for part in value) + "]"
    return scalar(value)
