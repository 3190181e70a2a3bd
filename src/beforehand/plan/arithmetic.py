"""The little arithmetic that a plan may write, as frozen trees: limits and derived columns.

From loose to tight: comparisons, ``+ -``, ``* /``, a leading minus, ``^`` (which binds to the right).
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Number:
    """A constant."""

    value: float


@dataclass(frozen=True, slots=True)
class Name:
    """A symbol of a limit, or a column."""

    text: str


@dataclass(frozen=True, slots=True)
class Negative:
    """The operand with its sign changed."""

    operand: Expression


@dataclass(frozen=True, slots=True)
class Operation:
    """Two operands under one of ``+ - * / ^ < <= > >= == !=``."""

    sign: str
    left: Expression
    right: Expression


@dataclass(frozen=True, slots=True)
class Call:
    """A function of one or more operands."""

    function: str
    arguments: tuple[Expression, ...]


Expression = Number | Name | Negative | Operation | Call

COMPARISONS = ("<", "<=", ">", ">=", "==", "!=")
SUMS = ("+", "-")
PRODUCTS = ("*", "/")

# How tightly each construct binds, for writing with as few brackets as its meaning allows.
_COMPARISON, _SUM, _PRODUCT, _MINUS, _POWER, _ATOM = range(6)
_BINDING = {
    **dict.fromkeys(COMPARISONS, _COMPARISON),
    **dict.fromkeys(SUMS, _SUM),
    **dict.fromkeys(PRODUCTS, _PRODUCT),
    "^": _POWER,
}

_BARE_NAME = re.compile(r"[^\W\d][\w.]*")


def names_in(expression: Expression) -> tuple[str, ...]:
    """Names that an expression uses, each once, in the order in which they first stand."""
    return tuple(dict.fromkeys(_names(expression)))


def written(expression: Expression, *, spaced: bool = True) -> str:
    """The one normal text of an expression: no needless brackets, one way to write a number.

    Parameters
    ----------
    expression : Expression
    spaced : bool
        Whether ``* / ^`` stand between spaces as the other signs do.
    """
    return _written(expression, _COMPARISON, spaced)


def _names(expression: Expression) -> Iterator[str]:
    """Every name from left to right."""
    match expression:
        case Name(text):
            yield text
        case Negative(operand):
            yield from _names(operand)
        case Operation(_, left, right):
            yield from _names(left)
            yield from _names(right)
        case Call(_, arguments):
            for argument in arguments:
                yield from _names(argument)


def _written(expression: Expression, outer: int, spaced: bool) -> str:
    """The text of an expression inside a construct that binds as tightly as ``outer``."""
    match expression:
        case Number(value):
            return _number_text(value)
        case Name(text):
            return text if _BARE_NAME.fullmatch(text) else "'" + text.replace("'", "''") + "'"
        case Call(function, arguments):
            return (
                f"{function}({', '.join(_written(argument, _COMPARISON, spaced) for argument in arguments)})"
            )
        case Negative(operand):
            binding, text = _MINUS, "-" + _written(operand, _MINUS, spaced)
        case Operation(sign, left, right):
            binding = _BINDING[sign]
            # A left operand may bind as loosely as its own sign, a right one only tighter; for ^ it
            # is the other way round, and its right operand may carry a minus of its own.
            if sign == "^":
                sides = (_written(left, _ATOM, spaced), _written(right, _MINUS, spaced))
            else:
                sides = (_written(left, binding, spaced), _written(right, binding + 1, spaced))
            if binding == _COMPARISON:
                sides = (_written(left, _SUM, spaced), _written(right, _SUM, spaced))
            gap = " " if spaced or binding <= _SUM else ""
            text = f"{sides[0]}{gap}{sign}{gap}{sides[1]}"
    return f"({text})" if binding < outer else text


def _number_text(value: float) -> str:
    """Shortest text that reads back as the same double; whole numbers without a dot."""
    return str(int(value)) if value.is_integer() and value < 1e15 else repr(value)
