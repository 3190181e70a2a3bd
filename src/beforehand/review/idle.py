"""Dead rules: clauses that are written and can never act.

A reader takes a written rule for one that holds. One that cannot act is worse than none.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

from pydantic import BaseModel

from beforehand.fields import default_of
from beforehand.plan import Plan
from beforehand.review.blocks import (
    bound_of,
    calls_ladder,
    flags,
    grounds,
    numbers,
    selects,
    single_rules,
    with_role,
)
from beforehand.review.findings import Finding, caution, have, listed, note, percent


def dead_rules(plan: Plan) -> tuple[Finding, ...]:
    """Every rule of a plan that cannot act, in the order of its blocks."""
    return tuple(finding for ask in _QUESTIONS for finding in ask(plan))


def differs(block: BaseModel, *, but: tuple[str, ...] = ()) -> tuple[str, ...]:
    """Keys of a block that are not as they are by default."""
    return tuple(
        field.alias or name
        for name, field in type(block).model_fields.items()
        if name not in but and getattr(block, name) != default_of(field)
    )


def _data(plan: Plan) -> Iterator[Finding]:
    if plan.data.labels_in_lock == "hashed" and plan.data.row_label is None:
        yield caution(
            "hashed-labels-idle", "data.labels_in_lock",
            "Labels are to be hashed and no column labels the rows, so only row numbers are hidden.",
        )  # fmt: skip


def _keep(plan: Plan) -> Iterator[Finding]:
    for place, rule in single_rules(plan):
        bound = bound_of(rule)
        backward = selects(plan) and plan.selection.method == "backward"
        if bound is not None and bound <= plan.alpha and backward:
            yield caution(
                "keep-bound-idle", f"keep[{place}].rule",
                f"The bound {bound:g} is not above alpha {plan.alpha:g}, and backward elimination removes "
                "only what has p above alpha: the rule keeps nothing there.",
            )  # fmt: skip
    removers = {"missing_data", "collinearity"} & set(plan.steps)
    mends = "transforms" in plan.steps and plan.transforms.if_none_works == "remove_predictor"
    if plan.keep and not removers and not mends and not selects(plan):
        yield note(
            "keep-idle", "keep",
            "No step of this plan removes predictors, so keep rules act only where predictors depend on each "
            "other exactly.",
        )  # fmt: skip


def _multiplicity(plan: Plan) -> Iterator[Finding]:
    focal = with_role(plan, "focal")
    if plan.multiplicity != "none" and len(focal) == 1:
        yield caution(
            "multiplicity-idle", "multiplicity",
            f"The correction is over focal predictors and only {focal[0]} is focal, so it changes nothing.",
        )  # fmt: skip


def _steps(plan: Plan) -> Iterator[Finding]:
    blocks: tuple[tuple[str, str, BaseModel, tuple[str, ...]], ...] = (
        # What a cell out of range becomes is decided on reading, whatever the steps.
        ("missing_data", "missing_data", plan.missing_data, ("out_of_range", "fill")),
        ("transforms", "transforms", plan.transforms, ()),
        ("collinearity", "collinearity", plan.collinearity, ()),
        ("influence", "influence", plan.influence, ()),
        ("selection", "selection", plan.selection, ()),
        ("selection", "weak_model", plan.weak_model, ()),
        ("final_checks", "final_checks", plan.final_checks, ()),
    )
    for step, name, block, but in blocks:
        changed = differs(block, but=but)
        if step not in plan.steps and changed:
            yield caution(
                "step-not-run", name,
                f"{listed(changed)} {have(changed, 'differs', 'differ')} from the default here, and the step "
                f"{step} does not run: the rule never acts.",
            )  # fmt: skip
    if "missing_data" not in plan.steps and plan.missing_data.fill:
        yield caution(
            "fill-idle", "missing_data.fill",
            f"A fill is written for {listed(plan.missing_data.fill)}, and the step missing_data does not "
            "run: no cell is filled and the rows leave.",
        )  # fmt: skip
    if plan.outcome.transforms and "transforms" not in plan.steps:
        yield caution(
            "step-not-run", "outcome.transforms",
            "The outcome has a ladder, and the step transforms does not run: the ladder is never climbed.",
        )  # fmt: skip
    if "transforms" not in plan.steps and "final_checks" not in plan.steps:
        changed = differs(plan.assumptions)
        if changed:
            yield caution(
                "step-not-run", "assumptions",
                f"{listed(changed)} {have(changed, 'differs', 'differ')} from the default here, and neither "
                "transforms nor final_checks runs: no check is made.",
            )  # fmt: skip


def _missing(plan: Plan) -> Iterator[Finding]:
    ranged = plan.outcome.range is not None or any(p.range is not None for p in plan.predictors)
    if plan.missing_data.out_of_range == "missing" and not ranged:
        yield caution(
            "out-of-range-idle", "missing_data.out_of_range",
            "Values out of range are to become missing and no range is declared, so none ever does.",
        )  # fmt: skip


def _transforms(plan: Plan) -> Iterator[Finding]:
    if "transforms" not in plan.steps:
        return
    block = plan.transforms
    if not numbers(plan):
        if differs(block):
            yield caution(
                "ladder-idle", "transforms", "No predictor is a number, so the ladder is never climbed."
            )
        return
    if not block.when:
        changed = [key for key in differs(block) if key != "when"]
        if changed:
            yield caution(
                "ladder-idle", "transforms.when",
                f"No check calls the ladder, so {listed(changed)} {have(changed, 'has', 'have')} no effect.",
            )  # fmt: skip
    else:
        skipped = [name for name in block.when if name not in calls_ladder(plan)]
        if skipped:
            yield caution(
                "ladder-idle", "transforms.when",
                f"The ladder is called by {listed(skipped)}, and assumptions says to skip "
                f"{have(skipped, 'that check', 'those checks')}.",
            )  # fmt: skip


def _collinearity(plan: Plan) -> Iterator[Finding]:
    if "collinearity" not in plan.steps:
        return
    block = plan.collinearity
    if block.examine_when.vif_above is None and block.examine_when.correlation_above is None:
        yield caution(
            "nothing-examined", "collinearity.examine_when",
            "No limit calls a pair up: a pair is examined only where the model is significant and no "
            "predictor is.",
        )  # fmt: skip
    if block.when_both_significant != "compare":
        changed = [key for key in differs(block) if key in ("large_change", "if_large", "if_small")]
        if changed:
            yield caution(
                "comparison-idle", "collinearity.when_both_significant",
                f"It says {block.when_both_significant}, so no comparison is made and {listed(changed)} "
                f"{have(changed, 'has', 'have')} no effect.",
            )  # fmt: skip
        return
    if block.if_large == block.if_small:
        yield caution(
            "comparison-idle", "collinearity.large_change",
            f"A large change and a small one both call for {block.if_large}: the comparison decides nothing.",
        )  # fmt: skip
    elif 0.0 in (block.large_change.r_squared, block.large_change.coefficient):
        yield caution(
            "comparison-idle", "collinearity.large_change",
            "Every change reaches 0 and counts as large, so if_small never acts.",
        )  # fmt: skip


def _influence(plan: Plan) -> Iterator[Finding]:
    if "influence" not in plan.steps:
        return
    block = plan.influence
    if block.at_most == 0.0 and grounds(plan):
        yield note(
            "removal-idle", "influence.at_most",
            f"At most {percent(0.0)} of the rows may leave, so remove_when removes none; each comparison is "
            "still reported.",
        )  # fmt: skip
    if not flags(plan):
        yield caution(
            "flag-idle", "influence.flag_when",
            "No measure flags a row, so only a row that alone carries a coefficient is looked at and "
            "remove_when has next to nothing to judge.",
        )  # fmt: skip


def _weak(plan: Plan) -> Iterator[Finding]:
    if "selection" not in plan.steps or not plan.keep:
        return
    if plan.weak_model.near <= plan.alpha:
        yield caution(
            "near-idle", "weak_model.near",
            f"Near misses reach up to {plan.weak_model.near:g}, which is not above alpha {plan.alpha:g}: no "
            "predictor is a miss and near.",
        )  # fmt: skip
    if plan.weak_model.with_theory == "try_selection" and plan.selection.method == "none":
        yield caution(
            "try-selection-idle", "weak_model.with_theory",
            "A weak model is to go on to selection, and selection.method is none: there is nothing to try.",
        )  # fmt: skip


def _rehearsal(plan: Plan) -> Iterator[Finding]:
    named = "expected" in plan.rehearsal.scenarios and "scenarios" in differs(plan.rehearsal)
    if named and plan.expects is None:
        yield caution(
            "expected-world-idle", "rehearsal.scenarios",
            "The expected world is to be rehearsed and nothing says what is expected.",
        )  # fmt: skip


_QUESTIONS: tuple[Callable[[Plan], Iterator[Finding]], ...] = (
    _data,
    _keep,
    _multiplicity,
    _steps,
    _missing,
    _transforms,
    _collinearity,
    _influence,
    _weak,
    _rehearsal,
)
