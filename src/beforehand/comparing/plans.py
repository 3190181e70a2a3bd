"""What changed between two plans, clause by clause, each change with its grade.

Two plans are compared as they are read, with every default in place, so that writing a default out,
another order of keys, or a comment is no change. Items of lists are matched by the names they carry.
"""

from __future__ import annotations

from collections.abc import Hashable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from beforehand.comparing.grades import GRADES
from beforehand.comparing.grading import graded
from beforehand.comparing.matching import labels_of, matched
from beforehand.comparing.rules import Grade, Items
from beforehand.comparing.telling import inside, listed, told, told_pair
from beforehand.faults import PlanError
from beforehand.plan import Plan, decisions_digest, with_changes
from beforehand.plan.block import Block
from beforehand.plan.places import keyed


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """One change from a plan to another.

    Attributes
    ----------
    clause : str
        Place in the plan: ``alpha``, ``predictors[load].range``, ``keep[outdoor_temp].rule``.
    grade : {"looser", "stricter", "different", "wording"}
        What it does to the standard of the answer.
    says : str
        The change in one sentence.
    """

    clause: str
    grade: Grade
    says: str


def plan_changes(old: Plan, new: Plan) -> tuple[Change, ...]:
    """Every change between two plans, in the order of the language.

    Parameters
    ----------
    old, new : Plan

    Returns
    -------
    tuple of Change
        Empty where the plans say the same. Where the digests of the decisions differ, at least one
        change is of another grade than ``wording``.

    Examples
    --------
    >>> from beforehand.plan import plan_from_mapping
    >>> plan = plan_from_mapping({
    ...     "language": 1, "title": "Six readings", "question": "Does y go with x?",
    ...     "data": {"file": "readings.csv"}, "outcome": {"column": "y"},
    ...     "predictors": [{"column": "x"}],
    ... })
    >>> [change.says for change in plan_changes(plan, plan.model_copy(update={"alpha": 0.10}))]
    ['alpha from 0.05 to 0.10: predictors pass more easily: looser.']
    """
    return tuple(
        change
        for name, field in Plan.model_fields.items()
        for change in _field(
            field.alias or name, field.alias or name, getattr(old, name), getattr(new, name), (old, new)
        )
    )


_Plans = tuple[Plan, Plan]


def _field(path: str, clause: str, old: Any, new: Any, plans: _Plans) -> Iterator[Change]:
    """Changes of one field: ``path`` is its key in the table of grades, ``clause`` its place in the plan."""
    if old == new:
        return
    rule = GRADES[path]
    if isinstance(old, Block) and type(old) is type(new):
        yield from _block(path, clause, old, new, plans)
    elif isinstance(rule, Items) and isinstance(old, Mapping) and isinstance(new, Mapping):
        yield from _mapping(rule, path, clause, old, new, plans)
    elif isinstance(rule, Items) and isinstance(old, tuple) and isinstance(new, tuple):
        yield from _list(rule, path, clause, old, new, plans)
    else:
        yield from _value(path, clause, old, new)


def _block(path: str, clause: str, old: Block, new: Block, plans: _Plans) -> Iterator[Change]:
    """Changes inside a block."""
    for name, field in type(old).model_fields.items():
        key = field.alias or name
        yield from _field(f"{path}.{key}", f"{clause}.{key}", getattr(old, name), getattr(new, name), plans)


def _value(path: str, clause: str, old: Any, new: Any) -> Iterator[Change]:
    """A change from one value to another."""
    before, now = told_pair(old, new)
    if isinstance(new, Block) and old is None:
        moved = f"{clause} is new"
    elif isinstance(old, Block) and new is None:
        moved = f"{clause} is gone"
    else:
        moved = f"{clause} from {before} to {now}"
    for found in graded(GRADES[path], old, new):
        yield _change(clause, found.grade, moved, found.why)


def _mapping(
    rule: Items, path: str, clause: str, old: Mapping[str, Any], new: Mapping[str, Any], plans: _Plans
) -> Iterator[Change]:
    """Changes of a mapping by name."""
    for name in old:
        place = keyed(clause, name)
        if name not in new:
            yield _change(place, rule.went, f"{place} is gone", rule.why_went)
        elif path == "alternatives" and old[name] != new[name]:
            yield _alternative(rule, place, old[name], new[name], plans[1])
        elif old[name] != new[name]:
            yield from _field(path, place, old[name], new[name], plans)
    for name in new:
        if name not in old:
            place = keyed(clause, name)
            yield _change(place, rule.came, f"{place} is new, {told(new[name])}", rule.why_came)


def _alternative(
    rule: Items, clause: str, old: Mapping[str, Any], new: Mapping[str, Any], plan: Plan
) -> Change:
    """An alternative is the plan that it leads to; how it is written is wording."""
    before, now = told_pair(old, new)
    moved = f"{clause} from {before} to {now}"
    try:
        same = decisions_digest(with_changes(plan, old)) == decisions_digest(with_changes(plan, new))
    except PlanError:
        same = False
    if same:
        return _change(clause, "wording", moved, "it leads to the same plan")
    return _change(clause, rule.changed, moved, rule.why_changed)


def _list(
    rule: Items, path: str, clause: str, old: tuple[Any, ...], new: tuple[Any, ...], plans: _Plans
) -> Iterator[Change]:
    """Changes of a list: items changed, gone, new, and the order of those that stay."""
    if not any(isinstance(item, Block | tuple) for item in (*old, *new)):
        yield from _words(rule, clause, old, new)
        return
    pairs = matched(path, old, new)
    labels = labels_of(path, old), labels_of(path, new)
    places = [place for place in pairs if place is not None]
    for position, item in enumerate(old):
        now = pairs[position]
        place = inside(clause, labels[0][position])
        if now is None:
            yield _change(place, rule.went, f"{place} is gone", rule.why_went)
        elif isinstance(item, Block):
            yield from _field(path, inside(clause, labels[1][now]), item, new[now], plans)
        elif item != new[now]:
            yield from _value(path, inside(clause, labels[1][now]), item, new[now])
    stayed = set(places)
    for position in range(len(new)):
        if position not in stayed:
            place = inside(clause, labels[1][position])
            yield _change(place, rule.came, f"{place} is new", rule.why_came)
    if places != sorted(places) and rule.order is not None:
        yield _change(clause, rule.order, f"{clause} stand in another order", rule.why_order)


def _words(
    rule: Items, clause: str, old: tuple[Hashable, ...], new: tuple[Hashable, ...]
) -> Iterator[Change]:
    """Changes of a list of single values."""
    before, now = dict.fromkeys(old), dict.fromkeys(new)
    went = [item for item in before if item not in now]
    came = [item for item in now if item not in before]
    if went:
        yield _change(clause, rule.went, f"{clause} loses {listed(went)}", rule.why_went)
    if came:
        yield _change(clause, rule.came, f"{clause} gains {listed(came)}", rule.why_came)
    if [item for item in old if item in now] != [item for item in new if item in before]:
        moved = f"{clause} from {told(old)} to {told(new)}"
        yield _change(clause, rule.order or "wording", moved, rule.why_order)


def _change(clause: str, grade: Grade, moved: str, why: str) -> Change:
    """A change with its sentence."""
    return Change(clause=clause, grade=grade, says=f"{moved}: {why}: {grade}.")
