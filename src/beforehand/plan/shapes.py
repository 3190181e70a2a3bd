"""From what pydantic finds wrong with the shape of a plan to faults in plain words, with places."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any, get_args

from pydantic import ValidationError
from pydantic_core import ErrorDetails

from beforehand.plan.block import TAG, Block
from beforehand.plan.complaint import Complaint, near
from beforehand.plan.model import Plan
from beforehand.plan.numbers import shown
from beforehand.plan.places import place_of


@dataclass(frozen=True, slots=True)
class Misshape:
    """One value of the wrong shape.

    Attributes
    ----------
    steps : tuple of str and int
        Keys and positions that lead to it.
    complaint : Complaint
    missing : bool
        Whether nothing stands there although something must.
    """

    steps: tuple[str | int, ...]
    complaint: Complaint
    missing: bool


def misshapes(error: ValidationError) -> tuple[Misshape, ...]:
    """Everything that pydantic found, in its order."""
    errors = error.errors(include_url=False)
    return tuple(_misshape(details) for details in errors if not _echo(details))


def _echo(details: ErrorDetails) -> bool:
    """Whether a list is called too short only because its misshapen items were not counted."""
    given = details["input"]
    return (
        details["type"] == "too_short"
        and isinstance(given, tuple)
        and len(given) >= details.get("ctx", {})["min_length"]
    )


def _misshape(details: ErrorDetails) -> Misshape:
    """One of pydantic's errors."""
    location = details["loc"]
    steps = tuple(step for step in location if isinstance(step, int) or not step.startswith(TAG))
    kind, given = details["type"], details["input"]
    what, code = _what(kind, given, details.get("ctx") or {}, location, steps)
    return Misshape(steps, Complaint(place_of(steps), what, code), kind == "missing")


def _what(
    kind: str,
    given: Any,
    context: Mapping[str, Any],
    location: tuple[str | int, ...],
    steps: tuple[str | int, ...],
) -> tuple[str, str]:
    """What to say, and the stable name of the fault."""
    if kind == "missing":
        return "is missing", "missing"
    if kind == "extra_forbidden":
        return _unknown_key(str(steps[-1]), location), "unknown_key"
    if kind in ("tuple_type", "list_type"):
        return f"is {shown(given)}; it must be a list, such as [first, second]", "list"
    if kind in ("model_type", "model_attributes_type", "dict_type", "mapping_type"):
        hint = "; leave the key out or give it keys of its own" if given is None else ""
        return f"is {shown(given)}; it must be a mapping, such as {{key: value}}{hint}", "mapping"
    if kind == "too_short":
        least, found = int(context["min_length"]), int(context["actual_length"])
        return f"has {_items(found)}; it must have at least {_items(least)}", "too_short"
    return str(context.get("message", f"is {shown(given)}, which cannot stand here")), kind


def _items(count: int) -> str:
    """A counted word."""
    return "one entry" if count == 1 else "no entry" if count == 0 else f"{count} entries"


def _unknown_key(key: str, location: tuple[str | int, ...]) -> str:
    """An unknown key, with the nearest known one or the block it belongs to."""
    block = _block_at(location[:-1])
    hint = near(key, _keys(block))
    if not hint:
        homes = [f"{name}." * bool(name) + key for name, one in _blocks() if key in _keys(one)]
        hint = f" (it belongs to the plan as {homes[0]})" if len(homes) == 1 else ""
    return f"is not a key that stands here{hint}"


def _keys(block: type[Block]) -> list[str]:
    """The keys of a block as they stand in a file."""
    return [field.alias or name for name, field in block.model_fields.items()]


def _blocks() -> Iterator[tuple[str, type[Block]]]:
    """The plan and each block that stands in it under one key."""
    yield "", Plan
    for name, field in Plan.model_fields.items():
        if isinstance(field.annotation, type) and issubclass(field.annotation, Block):
            yield name, field.annotation


def _block_at(location: Iterable[str | int]) -> type[Block]:
    """The model that reads what stands at a location."""
    block: type[Block] = Plan
    candidates: list[type[Block]] = []
    for step in location:
        if isinstance(step, int):
            continue
        if step.startswith(TAG):
            block = next((one for one in candidates if TAG + one.__name__ == step), block)
            continue
        field = next((f for name, f in block.model_fields.items() if (f.alias or name) == step), None)
        if field is not None:
            candidates = list(_models_in(field.annotation))
            block = candidates[0] if len(candidates) == 1 else block
    return block


def _models_in(annotation: Any) -> Iterator[type[Block]]:
    """The models that an annotation names."""
    if isinstance(annotation, type) and issubclass(annotation, Block):
        yield annotation
    for part in get_args(annotation):
        yield from _models_in(part)
