"""What makes the answer of an alternative a different one."""

from __future__ import annotations

from beforehand import wording
from beforehand.lock import (
    Answer,
)
from beforehand.running import Trail


def differences_from(
    main: Trail, main_answer: Answer | None, other: Trail, answer: Answer | None
) -> tuple[str, ...]:
    """What makes another answer a different one, by the plan's own tolerances.

    The status, the predictors adopted, a sign, or a coefficient that moves by more than
    ``refresh.coefficient`` standard errors of the main answer.
    """
    found: list[str] = []
    if main.status != other.status:
        found.append(f"The status is {other.status}, not {main.status}.")
    if main_answer is None or answer is None:
        return tuple(found)
    here = {term.term: term for term in main_answer.terms if term.predictor is not None}
    there = {term.term: term for term in answer.terms if term.predictor is not None}
    found += [f"{name} is no longer in the model." for name in here if name not in there]
    found += [f"{name} comes into the model." for name in there if name not in here]
    limit = main.plan.refresh.coefficient
    for name, term in here.items():
        if name not in there or there[name].transform != term.transform:
            continue
        now = there[name].coefficient
        if now * term.coefficient < 0:
            found.append(f"The sign of {name} changes.")
        elif term.standard_error and abs(now - term.coefficient) > limit * term.standard_error:
            moved = abs(now - term.coefficient) / term.standard_error
            found.append(
                f"{name} moves by {wording.number(moved)} standard errors, limit {wording.number(limit)}."
            )
    return tuple(found)
