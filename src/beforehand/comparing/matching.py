"""Items of two lists that are the same item: by the name they carry, never by their position."""

from __future__ import annotations

from collections import Counter
from collections.abc import Hashable, Iterable, Mapping
from typing import Any

from beforehand.plan import Derived, Eligibility, ExpectedCorrelation, KeepGroup, KeepPredictor, Predictor


def matched(path: str, old: tuple[Any, ...], new: tuple[Any, ...]) -> list[int | None]:
    """For each old item the position of the new one that it has become, or None.

    Parameters
    ----------
    path : str
        Place of the list in the language: ``predictors``.
    old, new : tuple
        Items of one list.

    Returns
    -------
    list of int or None, one an old item
    """
    if path == "amendments":
        # An account that only grows: the first stays the first.
        return [position if position < len(new) else None for position in range(len(old))]
    pairs: list[int | None] = [None] * len(old)
    left = dict.fromkeys(range(len(new)))
    for names in (_name, _near_names):
        waiting: dict[Hashable, list[int]] = {}
        for position in reversed(left):
            for name in names(new[position]):
                waiting.setdefault(name, []).append(position)
        for position, item in enumerate(old):
            if pairs[position] is None:
                pairs[position] = _taken(waiting, names(item), left)
    return pairs


def _taken(
    waiting: Mapping[Hashable, list[int]], names: Iterable[Hashable], left: dict[int, None]
) -> int | None:
    """The first new item under one of the names that nobody has taken; it is taken now."""
    for name in names:
        same = waiting.get(name, [])
        while same:
            position = same.pop()
            if position in left:
                del left[position]
                return position
    return None


def labels_of(path: str, items: tuple[Any, ...]) -> list[str]:
    """What each item is called in a clause; an item told by its column alone adds what tells it apart."""
    if path == "amendments":
        return [str(position) for position in range(len(items))]
    labels = [_label(item) for item in items]
    counts = Counter(labels)
    return [
        f"{label} {item.condition[0]}" if counts[label] > 1 and isinstance(item, Eligibility) else label
        for label, item in zip(labels, items, strict=True)
    ]


def _name(item: Any) -> tuple[Hashable, ...]:
    """The one name that tells an item from all others of its list."""
    match item:
        case Eligibility():
            return ((item.column, item.condition[0]),)
        case KeepGroup():
            return (("group", frozenset(item.at_least_one_of)),)
        case KeepPredictor():
            names = item.predictor
            return (names if isinstance(names, str) else frozenset(names),)
        case Derived() | Predictor():
            return (item.column,)
        case ExpectedCorrelation():
            return (frozenset(item.between),)
    return (frozenset(item) if isinstance(item, tuple) else item,)


def _near_names(item: Any) -> tuple[Hashable, ...]:
    """Names that a changed item still shares: its column, or a member of its group."""
    match item:
        case Eligibility():
            return (item.column,)
        case KeepGroup():
            return tuple(("group", member) for member in item.at_least_one_of)
    return ()


def _label(item: Any) -> str:
    """The name as it stands in a clause."""
    match item:
        case Eligibility() | Derived() | Predictor():
            return item.column
        case KeepGroup():
            return ", ".join(item.at_least_one_of)
        case KeepPredictor():
            return item.predictor if isinstance(item.predictor, str) else ", ".join(item.predictor)
        case ExpectedCorrelation():
            return ", ".join(item.between)
        case tuple():
            return ", ".join(map(str, item))
    return str(item)
