"""What stands between a file and a model: plain data, and mappings that cannot change."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any, TypeVar

Value = TypeVar("Value", covariant=True)


class Plain(str):
    """Text that stands in a file without quotes, so that the field it stands in decides its type.

    Text in quotes is a plain ``str`` and never becomes a number or a truth value.
    """

    __slots__ = ()


class FrozenMapping(Mapping[str, Value]):
    """A mapping that cannot change, in the order of its names, whatever order they came in.

    Parameters
    ----------
    items : mapping
        Copied; mappings inside are frozen too.
    """

    __slots__ = ("_items",)

    def __init__(self, items: Mapping[str, Value]) -> None:
        self._items = {name: _frozen(items[name]) for name in sorted(items)}

    def __getitem__(self, name: str) -> Value:
        value: Value = self._items[name]
        return value

    def __iter__(self) -> Iterator[str]:
        return iter(self._items)

    def __len__(self) -> int:
        return len(self._items)

    def __hash__(self) -> int:
        return hash(tuple(self._items.items()))

    def __repr__(self) -> str:
        return repr(self._items)

    def __reduce__(self) -> tuple[object, ...]:
        return type(self), (self._items,)


def _frozen(value: Any) -> Any:
    """The value with every mapping and list in it in a form that cannot change."""
    if isinstance(value, Mapping) and not isinstance(value, FrozenMapping):
        return FrozenMapping(value)
    if isinstance(value, tuple | list):
        return tuple(_frozen(item) for item in value)
    return value
