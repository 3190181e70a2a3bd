"""Rules that act as written and are known to mislead."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from beforehand.plan import Plan
from beforehand.plan.consistency_of_rules import can_apply
from beforehand.review.blocks import calls_ladder, grounds, numbers, selects, single_rules, with_role
from beforehand.review.findings import Finding, caution, listed, note, percent

# From so many numeric predictors on the chance of a needless transform is told.
_MANY_CHECKS = 8

# Grounds that judge a row by what it does to the finding.
_BY_RESULT = ("r_squared", "significance_changes", "sign_changes")


def misleading_rules(plan: Plan) -> tuple[Finding, ...]:
    """Every rule of a plan that is known to mislead, in the order of its blocks."""
    return tuple(finding for ask in _QUESTIONS for finding in ask(plan))


def _keep(plan: Plan) -> Iterator[Finding]:
    turning = "reciprocal" in plan.transforms.try_ and "transforms" in plan.steps and bool(calls_ladder(plan))
    for place, rule in single_rules(plan):
        if rule.expected_sign is None or not isinstance(rule.predictor, str):
            continue
        if turning and _may_be_reciprocal(plan, rule.predictor):
            yield note(
                "sign-may-turn", f"keep[{place}].expected_sign",
                f"If {rule.predictor} enters as its reciprocal, a rising effect has the other sign.",
            )  # fmt: skip
        if any(rule.predictor in parts for parts in plan.products):
            yield note(
                "sign-within-product", f"keep[{place}].expected_sign",
                f"{rule.predictor} is part of a product, so its coefficient is its effect where the other "
                "part is 0.",
            )  # fmt: skip


def _may_be_reciprocal(plan: Plan, name: str) -> bool:
    """Whether a predictor is a number that the reciprocal is defined for."""
    predictor = plan.predictor(name)
    return predictor.kind == "number" and can_apply("reciprocal", predictor.range)


def _checks(plan: Plan) -> Iterator[Finding]:
    curvature, count = plan.assumptions.curvature, len(numbers(plan))
    called = "transforms" in plan.steps and "curvature" in plan.transforms.when
    if curvature != "skip" and called and count >= _MANY_CHECKS:
        chance = 1.0 - (1.0 - curvature.alpha) ** count
        yield note(
            "many-checks", "assumptions.curvature",
            f"With {count} predictors checked at {curvature.alpha:g}, about {percent(chance)} of tables "
            "without any curve call at least one needless transform.",
        )  # fmt: skip


def _influence(plan: Plan) -> Iterator[Finding]:
    by_result = [name for name in grounds(plan) if name in _BY_RESULT]
    if "influence" in plan.steps and by_result and plan.influence.at_most > 0.0:
        yield caution(
            "removal-by-result", "influence.remove_when",
            f"{listed(by_result)} {'removes' if len(by_result) == 1 else 'remove'} rows by what they do to "
            "the finding, and so find effects in pure noise more often than alpha says.",
        )  # fmt: skip


def _selection(plan: Plan) -> Iterator[Finding]:
    focal = with_role(plan, "focal")
    if focal and selects(plan) and plan.purpose == "explain":
        yield note(
            "selected-p", "selection.method",
            "Predictors are selected and judged by the same data, so the p-values of the answer are too "
            "small and its intervals too short.",
        )  # fmt: skip


_QUESTIONS: tuple[Callable[[Plan], Iterator[Finding]], ...] = (
    _keep,
    _checks,
    _influence,
    _selection,
)
