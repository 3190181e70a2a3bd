"""Unreachable branches: fields of a plan that no run of it can come to.

Most of them are defaults that stand in the written-out plan, and only worth knowing. One that was
changed from its default is a caution, since somebody meant it to act.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

from beforehand.plan import Plan
from beforehand.review.blocks import calls_ladder, numbers
from beforehand.review.findings import Finding, caution, listed, note
from beforehand.review.idle import differs


def unreachable_branches(plan: Plan) -> tuple[Finding, ...]:
    """Every branch of a plan that cannot be reached, in the order of its blocks."""
    return tuple(finding for ask in _QUESTIONS for finding in ask(plan))


def _branch(clause: str, why: str, *, changed: bool) -> Finding:
    """A branch that cannot be reached, told louder where it was changed."""
    say = caution if changed else note
    return say("branch-unreachable", clause, f"{clause} is never reached: {why}.")


def _steps(plan: Plan) -> Iterator[Finding]:
    blocks = {
        "missing_data": ("missing_data.remove_predictor_above", "missing_data.fill"),
        "transforms": ("transforms",),
        "collinearity": ("collinearity",),
        "influence": ("influence",),
        "selection": ("selection", "weak_model"),
        "final_checks": ("final_checks",),
    }
    for step, clauses in blocks.items():
        if step not in plan.steps:
            for clause in clauses:
                # Where the block was changed, the same place is a dead rule and a caution there.
                yield _branch(clause, f"the step {step} does not run", changed=False)


def _missing(plan: Plan) -> Iterator[Finding]:
    if "missing_data" in plan.steps and plan.missing_data.remove_predictor_above >= 1.0:
        yield _branch("missing_data.remove_predictor_above", "no share is above 100 %", changed=False)


def _transforms(plan: Plan) -> Iterator[Finding]:
    if "transforms" not in plan.steps:
        return
    if numbers(plan) and not calls_ladder(plan):
        yield _branch(
            "transforms.if_none_works", "no check calls the ladder",
            changed="if_none_works" in differs(plan.transforms),
        )  # fmt: skip
    both_skipped = plan.assumptions.equal_spread == "skip" and plan.assumptions.normal_residuals == "skip"
    if plan.outcome.transforms and both_skipped:
        yield _branch(
            "outcome.transforms", "neither equal spread nor normal residuals is checked", changed=True
        )


def _collinearity(plan: Plan) -> Iterator[Finding]:
    block = plan.collinearity
    if "collinearity" not in plan.steps or block.when_both_significant == "compare":
        return
    for key in ("large_change", "if_large", "if_small"):
        # A changed one is a dead rule already.
        yield _branch(
            f"collinearity.{key}", f"when_both_significant says {block.when_both_significant}", changed=False
        )


def _weak(plan: Plan) -> Iterator[Finding]:
    if "selection" not in plan.steps:
        return
    if plan.keep:
        yield _branch("weak_model.without_theory", "the plan has keep rules", changed=False)
        return
    for key in ("with_theory", "near"):
        yield _branch(
            f"weak_model.{key}", "the plan has no keep rule", changed=key in differs(plan.weak_model)
        )


def _final(plan: Plan) -> Iterator[Finding]:
    if "final_checks" not in plan.steps:
        return
    block, assumptions = plan.final_checks, plan.assumptions
    changed = differs(block)
    skipped = {
        "if_curved": assumptions.curvature == "skip",
        "if_spread_unequal": assumptions.equal_spread == "skip",
        "if_not_normal": assumptions.normal_residuals == "skip",
        "if_dependent": assumptions.independence == "skip",
    }
    for key, skip in skipped.items():
        if skip:
            yield _branch(f"final_checks.{key}", "assumptions says to skip its check", changed=key in changed)
    if assumptions.independence != "skip" and assumptions.independence.in_order_of is None:
        yield _branch(
            "final_checks.if_dependent", "no order of the rows is named", changed="if_dependent" in changed
        )
    robust = plan.errors != "classical"
    if robust and block.if_spread_unequal == "robust_errors" and not skipped["if_spread_unequal"]:
        yield note(
            "branch-unreachable", "final_checks.if_spread_unequal",
            "robust_errors is never reached: errors are robust from the start, and a failure is reported.",
        )  # fmt: skip


def _alternatives(plan: Plan) -> Iterator[Finding]:
    unrun = [
        f"alternatives.{name}.{key}"
        for name, changes in plan.alternatives.items()
        for key in changes
        if key in _STEPS and key not in changes.get("steps", plan.steps)
    ]
    if unrun:
        yield caution(
            "alternative-unreachable", unrun[0],
            f"{listed(unrun)} {'changes' if len(unrun) == 1 else 'change'} a block whose step does not run.",
        )  # fmt: skip


_STEPS = ("missing_data", "transforms", "collinearity", "influence", "selection", "final_checks")

_QUESTIONS: tuple[Callable[[Plan], Iterator[Finding]], ...] = (
    _steps,
    _missing,
    _transforms,
    _collinearity,
    _weak,
    _final,
    _alternatives,
)
