"""What differs between two locks, place by place.

What a list holds is matched by the name that it carries (a fit's number, a term, a row), not by its
position, so that one more ruling is one difference. What a run was made with stays outside.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from operator import attrgetter
from typing import Any, Literal

from beforehand.lock.answer import AnswerPredictor, AnswerTerm, NearMiss, SignContradiction
from beforehand.lock.checks import (
    AssumptionCheck,
    Correlation,
    Descriptive,
    FillRecord,
    Inflation,
    InfluenceRow,
    MissingRecord,
)
from beforehand.lock.record import Record, Scalar
from beforehand.lock.trail import FitRecord, FitTerm, FitTest, LedgerStage, RowRemoved, RulingRecord
from beforehand.lock.writing import covered_text, one_line

# Ten recorded digits leave 5e-10 of a number open; what a replay on another machine may add stays
# well below this, and no difference that matters does.
RELATIVE = 1e-8

_OUTSIDE = frozenset({"environment", "digest"})

_NAMED_BY: Mapping[type, Callable[[Any], Any]] = {
    AnswerPredictor: attrgetter("predictor"),
    AnswerTerm: attrgetter("term"),
    AssumptionCheck: attrgetter("id"),
    Correlation: attrgetter("stage", "first", "second"),
    Descriptive: attrgetter("column"),
    FillRecord: attrgetter("predictor"),
    FitRecord: attrgetter("id"),
    FitTerm: attrgetter("term"),
    FitTest: attrgetter("predictor"),
    Inflation: attrgetter("stage", "predictor"),
    InfluenceRow: attrgetter("row"),
    LedgerStage: attrgetter("stage"),
    MissingRecord: attrgetter("predictor"),
    NearMiss: attrgetter("predictor"),
    RowRemoved: attrgetter("row"),
    RulingRecord: attrgetter("id"),
    SignContradiction: attrgetter("predictor"),
}

Kind = Literal["number", "text", "missing", "added"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Difference:
    """One place at which two locks differ.

    Attributes
    ----------
    place : str
        Path of the field: ``answer.terms[load].coefficient``.
    kind : str
        ``number``: two numbers farther apart than allowed; ``text``: any other two values;
        ``missing``: in the old one only; ``added``: in the new one only.
    old, new : scalar
        The two values; None on the side that has none. A whole record stands as one line.
    """

    place: str
    kind: Kind
    old: Scalar
    new: Scalar

    def __str__(self) -> str:
        if self.kind == "missing":
            return f"{self.place}: {one_line(self.old)} is missing"
        if self.kind == "added":
            return f"{self.place}: {one_line(self.new)} is new"
        return f"{self.place}: {one_line(self.old)} before, {one_line(self.new)} now"


@dataclass(frozen=True, slots=True, kw_only=True)
class Replay:
    """What came of computing a lock again.

    Attributes
    ----------
    same_bytes : bool
        Every line above the environment is the same.
    differences : tuple of Difference
        Empty where the bytes are the same, or where all that differs is within the tolerance.
    """

    same_bytes: bool
    differences: tuple[Difference, ...]


def replay_of(old: Record, new: Record, *, relative: float = RELATIVE) -> Replay:
    """Compare a lock with the same run computed again: bytes first, then values.

    Parameters
    ----------
    old, new : Lock, or another whole record
        The one on file, and the one computed now.
    relative : float
        Numbers as near as this, relative to the larger, are the same.
    """
    if covered_text(old) == covered_text(new):
        return Replay(same_bytes=True, differences=())
    return Replay(same_bytes=False, differences=differences(old, new, relative=relative))


def differences(old: Record, new: Record, *, relative: float = RELATIVE) -> tuple[Difference, ...]:
    """List every place at which two locks differ, in the order of the file.

    Parameters
    ----------
    old, new : Lock, or another whole record
        Two of a kind; environment and digest are not looked at.
    relative : float
        Numbers as near as this, relative to the larger, are the same. Counts must be equal.

    Returns
    -------
    tuple of Difference
    """
    return tuple(
        found
        for name in type(old).model_fields
        if name not in _OUTSIDE
        for found in _between(name, getattr(old, name), getattr(new, name), relative)
    )


def _between(place: str, old: Any, new: Any, relative: float) -> Iterator[Difference]:
    """Differences of two values at one place."""
    if isinstance(old, Record) and type(old) is type(new):
        for name in type(old).model_fields:
            yield from _between(f"{place}.{name}", getattr(old, name), getattr(new, name), relative)
    elif isinstance(old, Mapping) and isinstance(new, Mapping):
        yield from _named(place, old, new, relative, ordered=False)
    elif isinstance(old, tuple) and isinstance(new, tuple):
        yield from _listed(place, old, new, relative)
    elif _is_number(old) and _is_number(new):
        if not _near(old, new, relative):
            yield Difference(place=place, kind="number", old=old, new=new)
    elif type(old) is not type(new) or old != new:
        yield Difference(place=place, kind="text", old=_shown(old), new=_shown(new))


def _named(
    place: str, old: Mapping[str, Any], new: Mapping[str, Any], relative: float, *, ordered: bool
) -> Iterator[Difference]:
    """Differences of two collections whose items have names; the new ones last."""
    for name, value in old.items():
        inner = f"{place}[{name}]"
        if name in new:
            yield from _between(inner, value, new[name], relative)
        else:
            yield Difference(place=inner, kind="missing", old=_shown(value), new=None)
    for name, value in new.items():
        if name not in old:
            yield Difference(place=f"{place}[{name}]", kind="added", old=None, new=_shown(value))
    # Where all names are the same, their order is a difference of its own.
    if ordered and list(old) != list(new) and old.keys() == new.keys():
        yield Difference(place=place, kind="text", old=", ".join(old), new=", ".join(new))


def _listed(place: str, old: Sequence[Any], new: Sequence[Any], relative: float) -> Iterator[Difference]:
    """Differences of two lists: by the names of their items, else by position."""
    by_name = [_by_name(items) for items in (old, new)]
    ordered = by_name[0] is not None and by_name[1] is not None
    before, now = (
        names if ordered and names is not None else {str(place): item for place, item in enumerate(items)}
        for names, items in zip(by_name, (old, new), strict=True)
    )
    yield from _named(place, before, now, relative, ordered=ordered)


def _by_name(items: Sequence[Any]) -> dict[str, Any] | None:
    """Items by the name they carry; None where one has none or two share one."""
    found: dict[str, Any] = {}
    for item in items:
        name_of = _NAMED_BY.get(type(item))
        if name_of is None:
            return None
        name = name_of(item)
        found[name if isinstance(name, str) else ", ".join(name)] = item
    return found if len(found) == len(items) else None


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _near(old: float, new: float, relative: float) -> bool:
    """Whether two numbers are the same: counts exactly, others to the relative tolerance."""
    if isinstance(old, int) and isinstance(new, int):
        return old == new
    return abs(old - new) <= relative * max(abs(old), abs(new))


def _shown(value: Any) -> Scalar:
    """Show a scalar as it is, and a whole record by its sentence or else on one line."""
    if value is None or isinstance(value, bool | int | float | str):
        return value
    for name in ("says", "why"):
        if isinstance(sentence := getattr(value, name, None), str):
            return sentence
    return one_line(value)
