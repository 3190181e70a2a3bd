"""A change of one value under the rule of its field: its grade, and what follows from it."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from beforehand.comparing.rules import ANY_OTHER, Always, Ends, Grade, Items, Number, Rule, Words
from beforehand.faults import NumericalError
from beforehand.plan import Limit

# Tables on which two limits in n and p are compared: from a handful of rows to more than anybody has.
_TABLES = tuple(
    (rows, coefficients)
    for rows in (12, 50, 200, 1_000, 20_000, 1_000_000)
    for coefficients in (2, 5, 10, 40, 200)
    if coefficients < rows
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Graded:
    """What a change amounts to.

    Attributes
    ----------
    grade : str
    why : str
        What follows, in a few words.
    """

    grade: Grade
    why: str


def graded(rule: Rule, old: Any, new: Any) -> Iterator[Graded]:
    """Every grade of a change from one value to another; a pair can widen at one end and narrow at the other.

    Parameters
    ----------
    rule : Rule
        Of the field.
    old, new : object
        Two values of the field that are not equal.
    """
    match rule:
        case Always():
            yield Graded(grade=rule.grade, why=rule.why)
        case Number():
            yield _of_size(rule, _size(old, new))
        case Words():
            yield _of_rank(rule, _rank(rule, old), _rank(rule, new))
        case Ends():
            yield from _of_ends(rule, old, new)
        case Items():
            yield Graded(grade=rule.changed, why=rule.why_changed)
        case _:
            yield Graded(grade="different", why="another rule decides")


def _of_size(rule: Number, larger: int | None) -> Graded:
    """Of a number that grew (1), shrank (-1), or neither at every size of table (None)."""
    if larger is None:
        return Graded(grade="different", why="which limit is the larger hangs on the size of the table")
    if larger == 0:
        return Graded(grade="different", why="another formula with the same values")
    if (larger > 0) == (rule.up == "looser"):
        return Graded(grade="looser", why=rule.looser)
    return Graded(grade="stricter", why=rule.stricter)


def _size(old: Any, new: Any) -> int | None:
    """Whether the new limit is larger: 1 or -1, 0 for the same values, None where it depends."""
    signs: set[int] = set()
    for rows, coefficients in _TABLES:
        first, second = (_value(limit, rows, coefficients) for limit in (old, new))
        if first is not None and second is not None:
            signs.add((second > first) - (second < first))
    if {-1, 1} <= signs or not signs:
        return None
    return max(signs, key=abs)


def _value(limit: Any, rows: int, coefficients: int) -> float | None:
    """A limit's value on a table; null is one that nothing reaches; None where a formula has no value."""
    if limit is None:
        return math.inf
    if not isinstance(limit, Limit):
        return float(limit)
    try:
        return limit.value(rows, coefficients)
    except NumericalError:
        return None


def _rank(rule: Words, value: Any) -> int:
    """Place of a value from the strictest on."""
    for place, word in enumerate(rule.order):
        if word is value or (isinstance(word, str) and word != ANY_OTHER and word == value):
            return place
    return rule.order.index(ANY_OTHER) if ANY_OTHER in rule.order else -1


def _of_rank(rule: Words, old: int, new: int) -> Graded:
    """Of a choice that moved along the ranks."""
    if old == new or min(old, new) < 0:
        return Graded(grade="different", why=rule.different)
    if new > old:
        return Graded(grade="looser", why=rule.looser)
    return Graded(grade="stricter", why=rule.stricter)


def _of_ends(rule: Ends, old: Any, new: Any) -> Iterator[Graded]:
    """Of a pair of ends, of which either may have moved outwards or inwards."""
    (low, high), (low_now, high_now) = (_ends(pair) for pair in (old, new))
    if low_now < low or high_now > high:
        yield Graded(grade="looser", why=rule.looser)
    if low_now > low or high_now < high:
        yield Graded(grade="stricter", why=rule.stricter)


def _ends(pair: Any) -> tuple[float, float]:
    """A pair with its open ends at infinity."""
    low, high = (None, None) if pair is None else pair
    return (-math.inf if low is None else low), (math.inf if high is None else high)
