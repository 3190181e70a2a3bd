"""Open forks: decisions that a plan leaves to be made later, or leaves to chance.

A decision that is not written down is made after the results are seen, by someone who has seen
them. Each function asks about one block of the plan.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

from beforehand.plan import Plan
from beforehand.review.blocks import calls_ladder, flags, grounds, numbers, selects, single_rules, with_role
from beforehand.review.findings import Finding, caution, have, listed, note


def open_forks(plan: Plan) -> tuple[Finding, ...]:
    """Every open decision of a plan, in the order of its blocks."""
    return tuple(finding for ask in _QUESTIONS for finding in ask(plan))


def _data(plan: Plan) -> Iterator[Finding]:
    if plan.data.row_label is None:
        yield note(
            "row-label-open", "data.row_label",
            "No column labels the rows, so a row that is removed can only be named by a number.",
        )  # fmt: skip


def _population(plan: Plan) -> Iterator[Finding]:
    if not plan.eligibility:
        yield note(
            "eligibility-open", "eligibility",
            "No line says which rows belong to the question, so every row of the file counts.",
        )  # fmt: skip


def _outcome(plan: Plan) -> Iterator[Finding]:
    outcome = plan.outcome
    if outcome.smallest_effect_that_matters is None:
        yield note(
            "smallest-effect-open", "outcome.smallest_effect_that_matters",
            "No smallest effect that matters is stated, so nobody can say beforehand whether the table is "
            "large enough, nor afterwards whether an effect is worth acting on.",
        )  # fmt: skip
    if outcome.unit is None:
        yield note("outcome-unit-open", "outcome.unit", f"The unit of {outcome.column} is not stated.")
    if outcome.range is None:
        yield note(
            "outcome-range-open", "outcome.range",
            f"No range of {outcome.column} is declared, so an impossible value goes through unseen.",
        )  # fmt: skip


def _predictors(plan: Plan) -> Iterator[Finding]:
    ranges = [p.column for p in plan.predictors if p.kind == "number" and p.range is None]
    if ranges:
        yield note(
            "range-open", "predictors",
            f"No range is declared for {listed(ranges)}: impossible values go through unseen, and the plan "
            "does not say where the answer holds.",
        )  # fmt: skip
    derived = {line.column for line in plan.derive if line.unit is not None}
    units = [p.column for p in plan.predictors if p.kind == "number" and p.unit is None]
    units = [name for name in units if name not in derived]
    if units:
        yield note("unit-open", "predictors", f"No unit is stated for {listed(units)}.")
    for place, predictor in enumerate(plan.predictors):
        if predictor.kind != "category":
            continue
        if not _written(plan, f"predictors[{place}].baseline", otherwise=predictor.baseline is not None):
            first = f" ({predictor.levels[0]})" if predictor.levels else ""
            yield note(
                "baseline-open", f"predictors[{place}].baseline",
                f"No baseline is named for {predictor.column}, so its levels are compared with the first "
                f"one{first}.",
            )  # fmt: skip


def _written(plan: Plan, clause: str, *, otherwise: bool) -> bool:
    """Whether a field stands in the plan's file; ``otherwise`` for a plan that comes from none.

    The baseline is filled in on reading, so that only the file tells whether anyone chose it.
    """
    return otherwise if plan.origin is None else clause in plan.origin.lines


def _roles(plan: Plan) -> Iterator[Finding]:
    if plan.purpose != "explain":
        return
    focal, adjustment = with_role(plan, "focal"), with_role(plan, "adjustment")
    if not focal:
        yield caution(
            "focal-open", "predictors",
            "The purpose is to explain and no predictor is focal: the plan does not say which coefficients "
            "answer the question.",
        )  # fmt: skip
    if not adjustment:
        yield note(
            "adjustment-open", "predictors",
            "The purpose is to explain and no predictor has the role adjustment: the plan does not say what "
            "must be held equal for a fair comparison.",
        )  # fmt: skip
    held = {rule.predictor for _, rule in single_rules(plan) if isinstance(rule.predictor, str)}
    loose = [name for name in adjustment if name not in held]
    if loose and (selects(plan) or "collinearity" in plan.steps):
        yield caution(
            "adjustment-removable", "keep",
            f"{listed(loose)} {have(loose, 'is', 'are')} there to make the comparison fair, and no keep rule "
            f"holds {have(loose, 'it', 'them')}: a role protects nothing.",
        )  # fmt: skip


def _keep(plan: Plan) -> Iterator[Finding]:
    if not plan.keep and plan.purpose == "explain" and selects(plan):
        yield note(
            "theory-open", "keep",
            "No rule keeps a predictor, so p alone decides which ones the answer speaks of.",
        )  # fmt: skip
    for place, rule in enumerate(plan.keep):
        if rule.source is None:
            yield note(
                "keep-without-source", f"keep[{place}].source",
                "This keep rule names no source, so a reader cannot tell theory from opinion.",
            )  # fmt: skip


def _multiplicity(plan: Plan) -> Iterator[Finding]:
    focal = with_role(plan, "focal")
    if plan.multiplicity == "none" and len(focal) > 1:
        chance = 1.0 - (1.0 - plan.alpha) ** len(focal)
        yield caution(
            "multiplicity-open", "multiplicity",
            f"{len(focal)} predictors are focal and no p is corrected for that: of {len(focal)} independent "
            f"tests of nothing at least one is significant with probability {chance:.2f}, against "
            f"{plan.alpha:g} for one.",
        )  # fmt: skip


def _missing(plan: Plan) -> Iterator[Finding]:
    block = plan.missing_data
    if "missing_data" not in plan.steps:
        return
    if not block.fill:
        yield note(
            "fill-open", "missing_data.fill",
            "No predictor has a fill, so every row with an empty cell leaves.",
        )  # fmt: skip
    kept = [
        rule.predictor
        for _, rule in single_rules(plan)
        if isinstance(rule.predictor, str) and rule.predictor not in block.fill
    ]
    if kept and block.remove_predictor_above < 1.0:
        yield note(
            "kept-without-fill", "missing_data.fill",
            f"{listed(kept)} {have(kept, 'is', 'are')} kept by rule and {have(kept, 'has', 'have')} no fill: "
            f"the run stops when more than {100.0 * block.remove_predictor_above:.3g} % of such a column is "
            "missing.",
        )  # fmt: skip


def _assumptions(plan: Plan) -> Iterator[Finding]:
    independence = plan.assumptions.independence
    if "final_checks" not in plan.steps:
        yield note(
            "checks-open", "steps",
            "No final check is made, so an assumption that fails is not noticed.",
        )  # fmt: skip
    elif independence != "skip" and independence.in_order_of is None:
        yield note(
            "order-open", "assumptions.independence.in_order_of",
            "No column gives the order of the rows, so independence is never checked.",
        )  # fmt: skip


def _transforms(plan: Plan) -> Iterator[Finding]:
    if "transforms" in plan.steps and calls_ladder(plan) and numbers(plan) and not plan.transforms.try_:
        yield caution(
            "ladder-empty", "transforms.try",
            "A failed check calls the ladder and the ladder is empty: the only answer left is "
            f"if_none_works, which says {plan.transforms.if_none_works}.",
        )  # fmt: skip


def _influence(plan: Plan) -> Iterator[Finding]:
    if "influence" in plan.steps and flags(plan) and not grounds(plan):
        yield caution(
            "flag-without-ground", "influence.remove_when",
            "Rows are flagged and nothing says what removes one: whoever reads the flags will decide "
            "after the results.",
        )  # fmt: skip


def _expectations(plan: Plan) -> Iterator[Finding]:
    if plan.expects is None:
        yield note(
            "expects-open", "expects",
            "Nothing says what is expected, so the power for it cannot be told beforehand.",
        )  # fmt: skip
    if not plan.alternatives:
        yield note(
            "alternatives-open", "alternatives",
            "No alternatives are declared, so the record will not show whether the answer hangs on a "
            "single decision.",
        )  # fmt: skip


_QUESTIONS: tuple[Callable[[Plan], Iterator[Finding]], ...] = (
    _data,
    _population,
    _outcome,
    _predictors,
    _roles,
    _keep,
    _multiplicity,
    _missing,
    _assumptions,
    _transforms,
    _influence,
    _expectations,
)
