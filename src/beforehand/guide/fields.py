"""The fields of a block as the models of the plan describe them: name, default, meaning."""

from __future__ import annotations

import inspect
from collections.abc import Iterator, Sequence
from typing import Any, get_args, get_origin

from pydantic import BaseModel
from pydantic.fields import FieldInfo

from beforehand.fields import default_of, plain, words_of
from beforehand.plan import Plan


def described_fields(keys: Sequence[str]) -> str:
    """A Markdown list of everything that may be written under some top-level keys of the plan.

    Parameters
    ----------
    keys : sequence of str
        Top-level keys, for example ``influence``.

    Returns
    -------
    str
        A heading and one item a field: path, choices or default, description.
    """
    lines = [line for key in keys for line in _field(key, Plan.model_fields[_attribute(key)])]
    return "\n".join(["## Fields", "", *lines])


def _attribute(key: str) -> str:
    """The attribute of the plan that is written under a key."""
    return next(name for name, field in Plan.model_fields.items() if (field.alias or name) == key)


def _field(path: str, field: FieldInfo) -> Iterator[str]:
    """One field, then the fields of the models that may stand in it."""
    notes = [note for note in (_choices(field.annotation), _default(field)) if note]
    about = f" ({'; '.join(notes)})" if notes else ""
    yield f"- `{path}`{about}: {_sentence(field.description or '')}"
    models = tuple(_models(field.annotation))
    for model, listed in models:
        inside = f"{path}[]" if listed else path
        if len(models) > 1:
            yield f"- `{inside}`, one way to write it: {_sentence(inspect.getdoc(model) or '')}"
        for name, inner in model.model_fields.items():
            yield from _field(f"{inside}.{inner.alias or name}", inner)


def _models(annotation: Any, listed: bool = False) -> Iterator[tuple[type[BaseModel], bool]]:
    """The models inside an annotation, and whether each stands in a list."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        yield annotation, listed
        return
    inside = listed or get_origin(annotation) is tuple
    for part in get_args(annotation):
        yield from _models(part, inside)


def _choices(annotation: Any) -> str:
    """The words that a field may hold, where they are a closed list."""
    words = [f"`{word}`" for word in words_of(annotation)]
    if len(words) > 1:
        return ("any of " if get_origin(annotation) is tuple else "one of ") + ", ".join(words)
    return f"may be the word {words[0]}" if words and any(True for _ in _models(annotation)) else ""


def _default(field: FieldInfo) -> str:
    """What holds when the field is not written."""
    if field.is_required():
        return "no default"
    value = default_of(field)
    if isinstance(value, BaseModel):
        return ""
    return f"default {'none' if value is None or value == () or value == {} else plain(value)}"


def _sentence(text: str) -> str:
    """A description that ends with a full stop."""
    return text if not text or text[-1] in ".?" else f"{text}."
