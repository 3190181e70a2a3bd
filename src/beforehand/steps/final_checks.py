"""The final checks: what a failure calls for was written in the plan."""

from __future__ import annotations

from dataclasses import replace

from beforehand.plan import Plan
from beforehand.steps.bench import Bench, Checked, Fitted
from beforehand.steps.rulings import Ruling, Rulings
from beforehand.steps.state import State

STEP = "final_checks"

# The heteroscedasticity-consistent form that keeps its level best in small samples
# (MacKinnon & White 1985; Long & Ervin 2000).
ROBUST_FORM = "hc3"


def final_checks(state: State, plan: Plan, bench: Bench) -> tuple[State, tuple[Ruling, ...]]:
    """Curvature, RESET, spread, normality, independence, collinearity and influence once more."""
    rulings = Rulings(STEP, state.rulings_made)
    if state.working:
        model = bench.design(state)
        fitted = bench.fit(model, "final model")
        state = _curvature(state, plan, bench, fitted, rulings)
        state = _spread(state, plan, bench, fitted, rulings)
        state = _normality(state, plan, bench, fitted, rulings)
        state = _independence(state, plan, bench, fitted, rulings)
        bench.keep_check("collinearity", lambda: model)
        bench.keep_check("final_influence", lambda: fitted)
    return replace(state, rulings_made=rulings.count), tuple(rulings.made)


def _ruled(
    state: State,
    rulings: Rulings,
    clause: str,
    subject: str,
    checked: Checked,
    action: str,
    name: str,
) -> State:
    """One check: passed, not applicable, or failed and then what the plan calls for."""
    check = checked.check
    if check.p is None:
        ground = f"{name}_not_checked"
    elif not checked.failed:
        ground = f"{name}_passes"
    else:
        ground = f"{name}_fails_{action}"
    rulings.add(
        clause, subject, ground, fits=(checked.fit,), checks=(checked.id,),
        evidence={"check": check.name, "statistic": check.statistic, "p": check.p},
        value=check.p, limit=checked.alpha if check.p is not None else None,
        because=check.not_applicable or None,
    )  # fmt: skip
    if checked.failed and action == "stop":
        return replace(state, status="stopped")
    return state


def _curvature(state: State, plan: Plan, bench: Bench, fitted: Fitted, rulings: Rulings) -> State:
    """The added square of each numeric predictor, then the powers of the fitted values."""
    block = plan.assumptions.curvature
    if block == "skip":
        return state
    action = plan.final_checks.if_curved
    for predictor in plan.predictors:
        name = predictor.column
        if name in state.working and predictor.kind == "number":
            checked = bench.curvature(fitted, name, block.alpha)
            state = _ruled(state, rulings, "final_checks.if_curved", name, checked, action, "curvature")
    checked = bench.reset(fitted, block.alpha)
    return _ruled(state, rulings, "final_checks.if_curved", "the model", checked, action, "reset")


def _spread(state: State, plan: Plan, bench: Bench, fitted: Fitted, rulings: Rulings) -> State:
    """Equal spread; robust standard errors where the plan calls for them and has none already."""
    block = plan.assumptions.equal_spread
    if block == "skip":
        return state
    checked = bench.spread(fitted, None, block.test, block.alpha)
    action = plan.final_checks.if_spread_unequal
    if action == "robust_errors" and state.errors != "classical":
        action = "report"
    state = _ruled(state, rulings, "final_checks.if_spread_unequal", "the model", checked, action, "spread")
    if not checked.failed or action != "robust_errors":
        return state
    robust = bench.robust(fitted, ROBUST_FORM, "robust standard errors")
    if robust.fit.errors == "classical":
        rulings.add(
            "final_checks.if_spread_unequal", "the model", "robust_not_possible", fits=(fitted.id,),
            because="a row of leverage 1 leaves no residual to weigh",
        )  # fmt: skip
        return state
    changed = [
        name
        for name in state.working
        if fitted.significant(name, plan.alpha) != robust.significant(name, plan.alpha)
    ]
    rulings.add(
        "final_checks.if_spread_unequal", "the model", "robust_errors_used", fits=(fitted.id, robust.id),
        evidence={"changed": ", ".join(changed), "changes": len(changed)},
    )  # fmt: skip
    return replace(state, errors=ROBUST_FORM)


def _normality(state: State, plan: Plan, bench: Bench, fitted: Fitted, rulings: Rulings) -> State:
    """Normal residuals."""
    block = plan.assumptions.normal_residuals
    if block == "skip":
        return state
    checked = bench.normality(fitted, block.test, block.alpha)
    return _ruled(
        state, rulings, "final_checks.if_not_normal", "the model", checked,
        plan.final_checks.if_not_normal, "normality",
    )  # fmt: skip


def _independence(state: State, plan: Plan, bench: Bench, fitted: Fitted, rulings: Rulings) -> State:
    """Serial independence in the declared order; Durbin-Watson is held against its declared range."""
    block = plan.assumptions.independence
    if block == "skip":
        return state
    checked = bench.independence(fitted, block.test, block.lags, block.alpha)
    action = plan.final_checks.if_dependent
    clause = "final_checks.if_dependent"
    if block.test != "durbin_watson" or block.between is None or checked.check.statistic is None:
        return _ruled(state, rulings, clause, "the model", checked, action, "independence")
    low, high = block.between
    statistic = checked.check.statistic
    inside = low <= statistic <= high
    limit = low if abs(statistic - low) <= abs(statistic - high) else high
    rulings.add(
        clause, "the model", "independence_passes" if inside else f"independence_fails_{action}",
        fits=(checked.fit,), checks=(checked.id,),
        evidence={"check": "durbin_watson", "statistic": statistic, "low": low, "high": high},
        value=statistic, limit=limit,
    )  # fmt: skip
    return replace(state, status="stopped") if not inside and action == "stop" else state
