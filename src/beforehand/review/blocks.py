"""Questions about a plan that more than one part of a review asks."""

from __future__ import annotations

from beforehand.plan import KeepGroup, KeepPredictor, Plan, UnlessP


def numbers(plan: Plan) -> tuple[str, ...]:
    """Numeric predictors, in plan order."""
    return tuple(p.column for p in plan.predictors if p.kind == "number")


def with_role(plan: Plan, role: str) -> tuple[str, ...]:
    """Predictors of a role, in plan order."""
    return tuple(p.column for p in plan.predictors if p.role == role)


def single_rules(plan: Plan) -> tuple[tuple[int, KeepPredictor], ...]:
    """Keep rules about one predictor, each with its place among all keep rules."""
    return tuple((place, rule) for place, rule in enumerate(plan.keep) if not isinstance(rule, KeepGroup))


def bound_of(rule: KeepPredictor) -> float | None:
    """The bound of a keep rule; None for one that holds flatly."""
    return rule.rule.unless_p_above if isinstance(rule.rule, UnlessP) else None


def grounds(plan: Plan) -> tuple[str, ...]:
    """Grounds on which a flagged row leaves, by their key."""
    when = plan.influence.remove_when
    declared = {
        "coefficient": when.coefficient is not None,
        "r_squared": when.r_squared is not None,
        "significance_changes": when.significance_changes,
        "sign_changes": when.sign_changes,
    }
    return tuple(name for name, stands in declared.items() if stands)


def flags(plan: Plan) -> tuple[str, ...]:
    """Measures that flag a row, by their key."""
    when = plan.influence.flag_when
    names = tuple(type(when).model_fields)
    return tuple(name for name in names if getattr(when, name) is not None)


def calls_ladder(plan: Plan) -> tuple[str, ...]:
    """Checks that can call the ladder: named in ``transforms.when`` and not skipped."""
    skipped = {"curvature": plan.assumptions.curvature, "spread": plan.assumptions.equal_spread}
    return tuple(name for name in plan.transforms.when if skipped[name] != "skip")


def selects(plan: Plan) -> bool:
    """Whether the selection step can remove a predictor from a significant model."""
    return "selection" in plan.steps and plan.selection.method != "none"
