"""The alternatives of a plan: named changes, each of which leads to another plan that can be run."""

from __future__ import annotations

from typing import Any

from beforehand.plan.block import frozen
from beforehand.plan.canonical import decisions, written_out
from beforehand.plan.changes import NOT_CHANGED, as_read, merged
from beforehand.plan.complaint import UNKNOWN_NAME, Complaint
from beforehand.plan.consistency import complaints
from beforehand.plan.file_data import as_file_data
from beforehand.plan.model import Plan
from beforehand.plan.numbers import shown
from beforehand.plan.places import keyed
from beforehand.plan.validation import validated, without_reserved

# Each alternative is a run of its own; nobody reads more of them, and each costs a reading of the plan.
MOST_ALTERNATIVES = 100


def read_alternatives(
    plan: Plan, alternatives: Any, *, complete: bool
) -> tuple[dict[str, dict[str, Any]], list[Complaint]]:
    """Each alternative as the plan it leads to reads it, or what is wrong with it."""
    if not isinstance(alternatives, dict):
        what = f"is {shown(alternatives)}; it must be a mapping of names to changes"
        return {}, [Complaint("alternatives", what, "mapping")]
    if len(alternatives) > MOST_ALTERNATIVES:
        what = f"has {len(alternatives)} entries; more than {MOST_ALTERNATIVES} alternatives are not run"
        return {}, [Complaint("alternatives", what, "alternatives")]
    found: list[Complaint] = []
    read: dict[str, dict[str, Any]] = {}
    base = written_out(plan)
    seen = {_key(plan): ""}
    of_plan = {(one.place, one.what) for one in complaints(plan)}
    for name, changes in alternatives.items():
        place = keyed("alternatives", name)
        if not name.strip():
            found.append(Complaint(place, "has no name", "alternatives"))
            continue
        if not isinstance(changes, dict) or not changes:
            what = f"is {shown(changes) if changes else 'empty'}; it must be changes, such as {{alpha: 0.01}}"
            found.append(Complaint(place, what, "alternatives"))
            continue
        words = [
            Complaint(keyed(place, key), _no_change(key), "alternatives")
            for key in changes
            if key in NOT_CHANGED
        ]
        if words:
            found += words
            continue
        reserved: list[Complaint] = []
        changes = without_reserved(changes, reserved)
        changed, wrong, whole = validated(as_file_data(merged(base, changes), []))
        new = [
            Complaint(_inside(place, one.place), one.what, one.code)
            for one in [*reserved, *wrong]
            if (one.place, one.what) not in of_plan and (complete or one.code != UNKNOWN_NAME)
        ]
        found += new
        if new or changed is None or not whole:
            continue
        key = _key(changed)
        if key in seen:
            what = f"leads to the same plan as alternatives.{seen[key]}" if seen[key] else "changes nothing"
            found.append(Complaint(place, what, "alternatives"))
        seen.setdefault(key, name)
        read[name] = as_read(changes, written_out(changed))
    return read, found


def _key(plan: Plan) -> str:
    """What makes two plans the same in all that can change a result."""
    return repr(decisions(plan.model_copy(update={"alternatives": frozen({})})))


def _no_change(key: str) -> str:
    """Why an alternative cannot change this."""
    if key == "alternatives":
        return "is an alternative inside an alternative; write it beside the others"
    if key == "language":
        return "is the same for the plan and its alternatives"
    return "is only words; an alternative changes decisions"


def _inside(outer: str, inner: str) -> str:
    """A place inside another one."""
    return f"{outer}.{inner}" if inner else outer
