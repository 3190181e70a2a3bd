"""Whether an answer still holds on a refreshed table, by the plan's own tolerances."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from beforehand.comparing.answers import CoefficientPair
from beforehand.comparing.paths import RulingPair
from beforehand.faults import Fault
from beforehand.lock import Lock
from beforehand.plan import Plan

Verdict = Literal["holds", "moved", "broken"]

# Faults of a table that say that the world, not the file, has changed.
CONTRACT = frozenset({"unknown_level", "out_of_range", "not_a_number"})


@dataclass(frozen=True, slots=True, kw_only=True)
class Judged:
    """A verdict and every reason for it."""

    verdict: Verdict
    reasons: tuple[str, ...]


def broken_contract(faults: Sequence[Fault]) -> Judged | None:
    """The verdict on a table that no longer keeps the plan's contract; None for any other fault."""
    if not all(fault.code in CONTRACT for fault in faults):
        return None
    return Judged(
        verdict="broken",
        reasons=tuple(f"The contract is not kept: {fault.place}: {fault.what}." for fault in faults),
    )


def judged(
    plan: Plan, old: Lock, new: Lock, coefficients: Sequence[CoefficientPair], flipped: Sequence[RulingPair]
) -> Judged:
    """Hold the new answer against the old one.

    ``broken``: it ends otherwise, other predictors are in it, or a sign has turned. ``moved``: a
    coefficient or R² moved by more than the plan tolerates, or, where the plan asks for the same
    rulings, one flipped. ``holds``: neither.
    """
    broken: list[str] = []
    moved: list[str] = []
    if old.status != new.status:
        broken.append(f"The run ends {_words(new.status)}, not {_words(old.status)}.")
    for pair in coefficients:
        if pair.term == "intercept":
            continue
        if pair.new is None:
            broken.append(f"{pair.term} is no longer in the model.")
        elif pair.old is None:
            broken.append(f"{pair.term} comes into the model.")
        elif pair.old * pair.new < 0:
            broken.append(f"The sign of {pair.term} turns.")
        elif pair.shift is not None and abs(pair.shift) > plan.refresh.coefficient:
            moved.append(
                f"{pair.term} moves by {abs(pair.shift):.2f} old standard errors, "
                f"limit {plan.refresh.coefficient:g}."
            )
    if old.answer is not None and new.answer is not None:
        first, second = old.answer.r_squared, new.answer.r_squared
        if first is not None and second is not None and abs(second - first) > plan.refresh.r_squared:
            moved.append(f"R² moves from {first:.3f} to {second:.3f}, limit {plan.refresh.r_squared:g}.")
    if plan.refresh.rulings == "same":
        moved += [
            f"{pair.either.step.replace('_', ' ')} rules otherwise on {pair.either.subject}: "
            f"{_verdict(pair.old)} before, {_verdict(pair.new)} now."
            for pair in flipped
        ]
    verdict: Verdict = "broken" if broken else ("moved" if moved else "holds")
    return Judged(verdict=verdict, reasons=(*broken, *moved))


def _verdict(ruling: object) -> str:
    return _words(str(getattr(ruling, "verdict", "no ruling")))


def _words(name: str) -> str:
    return name.replace("_", " ")
