"""A plan with some of its decisions changed, as ``alternatives`` do."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from beforehand.plan.model import Plan

# What an alternative leaves as it is: the language, the words, the list of changes itself.
NOT_CHANGED = ("language", "title", "question", "written_by", "amendments", "alternatives")

# Values that are replaced whole, since their keys exclude each other.
_WHOLE = (
    ("errors",),
    ("missing_data", "fill", "*"),
    ("expects", "slopes", "*"),
    ("expects", "predictors", "*"),
)

# Mappings by name, from which a null takes an entry out.
_BY_NAME = (("missing_data", "fill"), ("expects", "slopes"), ("expects", "predictors"))


def with_changes(plan: Plan, changes: Mapping[str, Any]) -> Plan:
    """The plan with changes, itself a plan that can be run.

    Parameters
    ----------
    plan : Plan
    changes : mapping
        Under the keys of the file. Mappings are merged key by key, lists and single values are
        replaced whole; a null takes an entry out of ``missing_data.fill``, ``expects.slopes`` and
        ``expects.predictors``.

    Returns
    -------
    Plan
        Without alternatives of its own, from the same origin.

    Raises
    ------
    PlanError
        When the changed plan is not one that can be run.
    """
    from beforehand.plan.canonical import written_out
    from beforehand.plan.reading import plan_from_mapping

    base = written_out(plan) | {"alternatives": {}}
    name = plan.origin.name if plan.origin is not None else "plan"
    return plan_from_mapping(merged(base, changes), name=name).with_origin(plan.origin)


def merged(base: Mapping[str, Any], changes: Mapping[str, Any], path: tuple[str, ...] = ()) -> dict[str, Any]:
    """Plain data with changes merged in; neither argument is touched."""
    result = dict(base)
    for key, value in changes.items():
        here = (*path, key)
        before = result.get(key)
        if value is None and path in _BY_NAME:
            result.pop(key, None)
        elif isinstance(value, Mapping) and isinstance(before, Mapping) and not _is_whole(here):
            result[key] = merged(before, value, here)
        else:
            result[key] = value
    return result


def _is_whole(path: tuple[str, ...]) -> bool:
    """Whether the value at a path is replaced whole."""
    return any(
        len(path) == len(pattern) and all(want in ("*", key) for want, key in zip(pattern, path, strict=True))
        for pattern in _WHOLE
    )


def as_read(changes: Mapping[str, Any], changed: Mapping[str, Any]) -> dict[str, Any]:
    """The changes with the values that the changed plan reads from them: ``5%`` becomes 0.05.

    Parameters
    ----------
    changes : mapping
        As written.
    changed : mapping
        The changed plan, written out.
    """
    result: dict[str, Any] = {}
    for key, value in changes.items():
        after = changed.get(key)
        result[key] = (
            as_read(value, after) if isinstance(value, Mapping) and isinstance(after, Mapping) else after
        )
    return result
