"""What can still be read of a plan with misshapen parts, so that its other faults are found too."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from pydantic import ValidationError

from beforehand.plan.complaint import UNKNOWN_NAME, Complaint
from beforehand.plan.model import Plan
from beforehand.plan.places import place_of
from beforehand.plan.shapes import Misshape, misshapes

# Stand in for what must be there; no complaint about them reaches a person.
_STAND_INS: Mapping[str, Any] = {
    "language": 1,
    "title": "title",
    "question": "question",
    "data": {"file": "table.csv"},
    "outcome": {"column": "\x1f"},
}

# Parts that names come from: with one of them set aside, a name may only seem unknown.
_NAMING = frozenset({"predictors", "derive", "outcome", "products"})

# Faults that stand whatever else is wrong in the same place; others may come from what was set aside.
_FIRM = frozenset({"outcome_used", "repeated", "data_file", "steps", UNKNOWN_NAME})

# Faults that may come from a kind or a role that was set aside.
_SHAKY = frozenset({"idle", "kind"})

_TOP_LIST = re.compile(r"(\w+)\[(\d+)\](.*)", re.DOTALL)


@dataclass(frozen=True, slots=True, kw_only=True)
class Salvage:
    """A plan of what is left.

    Attributes
    ----------
    plan : Plan
    kept : mapping of str to tuple of int
        For each list from which items were set aside: the positions that the others had.
    touched : frozenset of str
        Places (``alpha``, ``predictors[2]``) in which something was misshapen.
    names_complete : bool
        Whether no part that names columns was set aside as a whole.
    """

    plan: Plan
    kept: Mapping[str, tuple[int, ...]]
    touched: frozenset[str]
    names_complete: bool

    def renumbered(self, complaint: Complaint) -> Complaint:
        """The complaint with the position that its item has in the file."""
        found = _TOP_LIST.fullmatch(complaint.place)
        if found is None or found[1] not in self.kept:
            return complaint
        place = f"{found[1]}[{self.kept[found[1]][int(found[2])]}]{found[3]}"
        return Complaint(place, complaint.what, complaint.code)

    def vouches_for(self, complaint: Complaint) -> bool:
        """Whether a complaint, renumbered, is sure not to come from what was set aside."""
        named = any(_TOP_LIST.sub(r"\1", part) in _NAMING for part in self.touched)
        if "\\x1f" in complaint.what or (named and complaint.code in _SHAKY):
            return False
        if complaint.code == UNKNOWN_NAME and not self.names_complete:
            return False
        return _part(complaint.place) not in self.touched or complaint.code in _FIRM


def salvaged(data: Mapping[str, Any], wrong: Sequence[Misshape]) -> Salvage | None:
    """Read what is not misshapen; None when too little is left.

    First single values are set aside, so that their defaults stand; where that does not do, the whole
    item of a list or the whole block goes, with a stand-in for what must be there.
    """
    rest: dict[str, Any] = dict(data)
    for one in wrong:
        if not one.missing:
            _drop(rest, one.steps)
    kept: dict[str, tuple[int, ...]] = {}
    complete = not any(one.steps[0] in _NAMING for one in wrong if len(one.steps) == 1)
    still = _read(rest)
    if not isinstance(still, Plan):
        complete = complete and not any(str(one.steps[0]) in _NAMING for one in still if one.steps)
        kept = _set_aside(rest, still)
        still = _read(rest)
    if not isinstance(still, Plan):
        return None
    return Salvage(
        plan=still,
        kept=kept,
        touched=frozenset(_part(place_of(one.steps)) for one in wrong),
        names_complete=complete,
    )


def _read(data: Mapping[str, Any]) -> Plan | tuple[Misshape, ...]:
    """The plan, or what is misshapen in it."""
    try:
        return Plan.model_validate(data)
    except ValidationError as error:
        return misshapes(error)


def _part(place: str) -> str:
    """The block, or the item of a list at the top, in which a place is."""
    found = re.match(r"\w+(?:\[\d+\])?", place)
    return found.group() if found else place


def _drop(data: dict[str, Any], steps: tuple[str | int, ...]) -> None:
    """Take the key of a block, or of an item of a list, out; the original data stay as they are."""
    if not steps:
        return
    top = str(steps[0])
    inner = data.get(top)
    if len(steps) == 1:
        data.pop(top, None)
    elif isinstance(inner, dict):
        data[top] = {key: value for key, value in inner.items() if key != steps[1]}
    elif isinstance(inner, tuple) and isinstance(steps[1], int) and len(steps) > 2:
        item = inner[steps[1]]
        if isinstance(item, dict):
            less = {key: value for key, value in item.items() if key != steps[2]}
            data[top] = (*inner[: steps[1]], less, *inner[steps[1] + 1 :])


def _set_aside(data: dict[str, Any], wrong: Sequence[Misshape]) -> dict[str, tuple[int, ...]]:
    """Take whole items and blocks out; the positions that the other items of each list had."""
    items: dict[str, set[int]] = {}
    for one in wrong:
        if not one.steps:
            continue
        top = str(one.steps[0])
        if len(one.steps) > 1 and isinstance(one.steps[1], int):
            items.setdefault(top, set()).add(one.steps[1])
        elif top in _STAND_INS:
            data[top] = _STAND_INS[top]
        else:
            data.pop(top, None)
    kept: dict[str, tuple[int, ...]] = {}
    for top, numbers in items.items():
        whole = data[top]
        kept[top] = tuple(number for number in range(len(whole)) if number not in numbers)
        data[top] = tuple(whole[number] for number in kept[top])
    return kept
