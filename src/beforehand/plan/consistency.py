"""What a plan of the right shape can still get wrong: parts that do not fit each other.

``complaints`` asks every check below and in its two neighbours, in the order of the plan's blocks. A
check looks at a ``Plan`` and yields what is wrong and where; it never stops at the first.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

from beforehand.plan import consistency_of_columns, consistency_of_rules
from beforehand.plan.blocks import AutocorrelationLags
from beforehand.plan.complaint import Complaint, repeated
from beforehand.plan.model import STEPS, Plan

Check = Callable[[Plan], Iterator[Complaint]]


def complaints(plan: Plan) -> tuple[Complaint, ...]:
    """Everything in a plan that does not fit together, in the order of its blocks.

    Parameters
    ----------
    plan : Plan
        Of the right shape. Its alternatives are not looked into: each is a plan of its own.

    Returns
    -------
    tuple of Complaint
        Empty for a plan that can be run.
    """
    return tuple(complaint for check in CHECKS for complaint in check(plan))


def _steps(plan: Plan) -> Iterator[Complaint]:
    """Each step once, missing_data first and final_checks last."""
    for number, step in enumerate(plan.steps):
        place = f"steps[{number}]"
        if step in plan.steps[:number]:
            yield Complaint(place, f"takes the step {step} a second time", "steps")
        elif step == STEPS[0] and number > 0:
            yield Complaint(place, f"has {step} after {plan.steps[number - 1]}; it comes first", "steps")
        elif step == STEPS[-1] and number < len(plan.steps) - 1:
            yield Complaint(place, f"has {step} before {plan.steps[number + 1]}; it comes last", "steps")


def _lists_without_repeats(plan: Plan) -> Iterator[Complaint]:
    """Lists of words in which a word a second time means nothing."""
    lists: tuple[tuple[str, tuple[str, ...]], ...] = (
        ("data.missing_codes", plan.data.missing_codes),
        ("outcome.transforms", plan.outcome.transforms),
        ("transforms.when", plan.transforms.when),
        ("transforms.try", plan.transforms.try_),
        ("rehearsal.scenarios", plan.rehearsal.scenarios),
    )
    for place, words in lists:
        yield from repeated(place, words)


def _independence(plan: Plan) -> Iterator[Complaint]:
    """A statistic needs its bounds, and a test with a p value has none."""
    check = plan.assumptions.independence
    place = "assumptions.independence"
    if check != "skip":
        if check.test == "durbin_watson" and check.between is None:
            what = "is missing; durbin_watson has no p value, so say where it must lie, such as [1.5, 2.5]"
            yield Complaint(f"{place}.between", what, "independence")
        if check.test == "durbin_watson" and check.lags != 1:
            yield Complaint(
                f"{place}.lags", "has no meaning for durbin_watson, which looks one row back", "idle"
            )
        if check.test != "durbin_watson" and check.between is not None:
            what = f"has no meaning for {check.test}, which is judged by its p; leave it out"
            yield Complaint(f"{place}.between", what, "idle")
        if check.between is not None and not 0.0 <= check.between[0] < check.between[1] <= 4.0:
            yield Complaint(
                f"{place}.between", "reaches beyond 0 to 4, where the statistic always lies", "independence"
            )


def _autocorrelation(plan: Plan) -> Iterator[Complaint]:
    """Errors for neighbours in order need to know the order."""
    check = plan.assumptions.independence
    ordered = check != "skip" and check.in_order_of is not None
    if isinstance(plan.errors, AutocorrelationLags) and not ordered:
        what = "needs an order of the rows; name its column in assumptions.independence.in_order_of"
        yield Complaint("errors.autocorrelation_lags", what, "independence")


def _multiplicity(plan: Plan) -> Iterator[Complaint]:
    """An adjustment over focal predictors needs some."""
    if plan.multiplicity != "none" and not any(p.role == "focal" for p in plan.predictors):
        what = f"is {plan.multiplicity}, but no predictor has role: focal, so there is nothing to adjust"
        yield Complaint("multiplicity", what, "idle")


CHECKS: tuple[Check, ...] = (
    *consistency_of_columns.CHECKS,
    *consistency_of_rules.CHECKS,
    _lists_without_repeats,
    _multiplicity,
    _steps,
    _independence,
    _autocorrelation,
)
