"""From data to a plan, as far as it can be read, and to all that is wrong with it."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from pydantic import ValidationError

from beforehand.plan.complaint import Complaint
from beforehand.plan.consistency import complaints
from beforehand.plan.model import LANGUAGE, Plan
from beforehand.plan.numbers import NUMBER
from beforehand.plan.places import keyed
from beforehand.plan.salvage import salvaged
from beforehand.plan.shapes import misshapes

# Words kept for later versions of the language, with what they will be about.
_RESERVED = {"weights": "weighted rows", "hold_out": "rows held out for a test"}
_LATER = "is kept for a later version of the plan language ({what}); this one cannot do it"


def validated(data: dict[str, Any]) -> tuple[Plan | None, list[Complaint], bool]:
    """The plan, as far as it can be read; what is wrong; whether every name in it was read."""
    try:
        plan = Plan.model_validate(data)
    except ValidationError as error:
        wrong = misshapes(error)
        rest = salvaged(data, wrong)
        found = [one.complaint for one in wrong]
        if rest is None:
            return None, found, False
        fitting = (rest.renumbered(one) for one in complaints(rest.plan))
        return rest.plan, found + [one for one in fitting if rest.vouches_for(one)], rest.names_complete
    return plan, list(complaints(plan)), True


def newer_language(data: Mapping[str, Any]) -> Complaint | None:
    """A plan of another version of the language is not looked into."""
    written = data.get("language", LANGUAGE)
    text = str(written)
    if isinstance(written, bool) or not NUMBER.fullmatch(text) or len(text) > 20 or float(text) <= LANGUAGE:
        return None
    what = f"is {text}, a version of the plan language newer than this program, which reads {LANGUAGE}"
    return Complaint("language", what, "language")


def without_reserved(data: dict[str, Any], found: list[Complaint]) -> dict[str, Any]:
    """The data without words that belong to a later version of the language."""
    for word, about in _RESERVED.items():
        if word in data:
            found.append(Complaint(word, _LATER.format(what=about), "reserved"))
    rest = {key: value for key, value in data.items() if key not in _RESERVED}
    block = rest.get("missing_data")
    fill = block.get("fill") if isinstance(block, dict) else None
    if isinstance(block, dict) and isinstance(fill, dict):
        later = [name for name, how in fill.items() if isinstance(how, dict) and "impute" in how]
        for name in later:
            place = keyed(keyed("missing_data.fill", name), "impute")
            found.append(Complaint(place, _LATER.format(what="multiple imputation"), "reserved"))
        rest["missing_data"] = {
            **block,
            "fill": {name: how for name, how in fill.items() if name not in later},
        }
    return rest
