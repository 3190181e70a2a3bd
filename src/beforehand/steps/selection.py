"""The selection step: how predictors that do not show leave, one at a time.

The model's F test comes first; where it is not significant the weak-model rule decides.
"""

from __future__ import annotations

import math
from dataclasses import replace

from beforehand.fit.power import needed_n
from beforehand.plan import KeepGroup, Plan
from beforehand.steps.bench import Bench, Fitted
from beforehand.steps.collinearity import rounded
from beforehand.steps.keeping import Hold, Keeping, order_of
from beforehand.steps.rulings import Ruling, Rulings
from beforehand.steps.state import NearMiss, State

STEP = "selection"

# Power at which the needed sample of a near miss is stated (Cohen 1988: the usual convention).
POWER = 0.80


def selection(state: State, plan: Plan, bench: Bench) -> tuple[State, tuple[Ruling, ...]]:
    """F test of the working model, then the declared method, or the weak-model rule."""
    rulings = Rulings(STEP, state.rulings_made)
    state = replace(state, full_model=bench.design(state))
    if state.working:
        state = _select(state, plan, bench, rulings)
    if not state.working and not state.status:
        rulings.add("selection", plan.outcome.column, "mean_is_answer")
        state = replace(state, status="mean_only")
    return replace(state, rulings_made=rulings.count), tuple(rulings.made)


def _select(state: State, plan: Plan, bench: Bench, rulings: Rulings) -> State:
    """The method, on a model with at least one predictor."""
    fitted = bench.fit(bench.design(state), "full model")
    f_p = fitted.fit.f_p
    weak = f_p is not None and f_p > plan.alpha
    rulings.add(
        "alpha", "the model", "model_weak" if weak else "model_significant", fits=(fitted.id,),
        evidence={"f": fitted.fit.f, "p": f_p}, value=f_p, limit=plan.alpha,
    )  # fmt: skip
    if weak:
        if not Keeping(plan).theory:
            return _mean_only(state, plan, rulings, fitted)
        state = _near_misses(state, plan, fitted, rulings)
        if plan.weak_model.with_theory == "report":
            return replace(state, status="inconclusive")
    method = plan.selection.method
    if method == "none":
        rulings.add("selection.method", "the model", "full_model_stands", fits=(fitted.id,))
        return state
    if method == "best_subset":
        return _best_subset(state, plan, bench, rulings, fitted)
    if method == "backward":
        return _backward(state, plan, bench, rulings)
    return _by_criterion(state, plan, bench, rulings, method.removeprefix("backward_"))


def _mean_only(state: State, plan: Plan, rulings: Rulings, fitted: Fitted) -> State:
    """Without theory a weak model gives way to the mean: every predictor leaves."""
    ruling = rulings.add(
        "weak_model.without_theory", "the model", "weak_without_theory", fits=(fitted.id,),
        evidence={"p": fitted.fit.f_p}, value=fitted.fit.f_p, limit=plan.alpha,
    )  # fmt: skip
    for name in state.working:
        state = state.leaves(name, step=STEP, ruling=ruling.id)
    return state


def _near_misses(state: State, plan: Plan, fitted: Fitted, rulings: Rulings) -> State:
    """Predictors near alpha, each with the sample that its observed effect would need."""
    misses: list[NearMiss] = []
    for name in state.working:
        test = fitted.fit.tests[name]
        if test.p is None or test.partial_f2 is None or test.p > plan.weak_model.near:
            continue
        needed = needed_n(
            partial_f2=test.partial_f2, df=test.df, p=fitted.fit.p, alpha=plan.alpha, power=POWER
        )
        misses.append(NearMiss(predictor=name, p=test.p, partial_f2=test.partial_f2, rows_needed=needed))
        rulings.add(
            "weak_model.near", name, "near_miss", fits=(fitted.id,),
            evidence={"p": test.p, "partial_f2": test.partial_f2, "rows_needed": needed, "power": POWER},
            value=test.p, limit=plan.weak_model.near,
        )  # fmt: skip
    return replace(state, near_misses=tuple(misses))


def _held(
    name: str,
    state: State,
    keeping: Keeping,
    fitted: Fitted,
    rulings: Rulings,
    seen: set[tuple[str, str]],
    alpha: float,
) -> Hold | None:
    """What prevents a removal; ruled on once for each predictor and clause."""
    p = fitted.p_of(name)
    hold = keeping.hold(name, state.working, p)
    if hold is not None and (name, hold.clause) not in seen:
        seen.add((name, hold.clause))
        rulings.add(
            hold.clause, name, hold.ground, fits=(fitted.id,), evidence={"p": p, "alpha": alpha},
            value=p, limit=alpha if hold.limit is None else hold.limit, because=hold.because,
        )  # fmt: skip
    return hold


def _backward(state: State, plan: Plan, bench: Bench, rulings: Rulings) -> State:
    """Remove the predictor with the largest p above alpha, refit, repeat."""
    keeping, order = Keeping(plan), order_of(plan)
    seen: set[tuple[str, str]] = set()
    while state.working:
        fitted = bench.fit(bench.design(state), "working model")
        # One key for the choice: the largest p, then the smaller statistic, then the later in the plan.
        ranked = sorted(
            (name for name in state.working if not fitted.significant(name, plan.alpha)),
            key=lambda name: (
                -rounded(fitted.p_of(name) or 0.0),
                rounded(fitted.statistic_of(name)),
                -order[name],
            ),
        )
        leaving = None
        for name in ranked:
            if _held(name, state, keeping, fitted, rulings, seen, plan.alpha) is None:
                leaving = name
                break
        if leaving is None:
            break
        p = fitted.p_of(leaving)
        ruling = rulings.add(
            "selection.method", leaving, "leaves_backward", fits=(fitted.id,),
            evidence={"p": p}, value=p, limit=plan.alpha,
        )  # fmt: skip
        state = state.leaves(leaving, step=STEP, ruling=ruling.id)
    return _close(state, plan, bench, rulings)


def _by_criterion(state: State, plan: Plan, bench: Bench, rulings: Rulings, criterion: str) -> State:
    """Remove what lowers AIC (Akaike 1974) or BIC (Schwarz 1978) most, until nothing does.

    The criterion without a predictor follows from its partial F in the working fit, so that each
    round is recomputable from one recorded fit.
    """
    keeping, order = Keeping(plan), order_of(plan)
    seen: set[tuple[str, str]] = set()
    while state.working:
        fitted = bench.fit(bench.design(state), "working model")
        changes = {
            name: change
            for name in state.working
            if (change := _criterion_change(fitted, name, criterion)) is not None
        }
        ranked = sorted(
            (name for name, change in changes.items() if change < 0.0),
            key=lambda name: (rounded(changes[name]), -order[name]),
        )
        leaving = next(
            (
                name
                for name in ranked
                if _held(name, state, keeping, fitted, rulings, seen, plan.alpha) is None
            ),
            None,
        )
        if leaving is None:
            break
        ruling = rulings.add(
            "selection.method", leaving, f"leaves_{criterion}", fits=(fitted.id,),
            evidence={"p": fitted.p_of(leaving), f"change_{criterion}": changes[leaving]},
            value=changes[leaving], limit=0.0,
        )  # fmt: skip
        state = state.leaves(leaving, step=STEP, ruling=ruling.id)
    return _close(state, plan, bench, rulings)


def _criterion_change(fitted: Fitted, name: str, criterion: str) -> float | None:
    """AIC or BIC without the predictor, less the one with it; None in an exact fit."""
    test, fit = fitted.fit.tests[name], fitted.fit
    if test.partial_f2 is None:
        return None
    penalty = 2.0 if criterion == "aic" else math.log(fit.n)
    return fit.n * math.log1p(test.partial_f2) - penalty * test.df


def _best_subset(state: State, plan: Plan, bench: Bench, rulings: Rulings, fitted: Fitted) -> State:
    """The largest adjusted R² among subsets whose predictors are all significant or kept."""
    keeping = Keeping(plan)
    always = tuple(name for name in state.working if keeping.always(name))
    groups = [
        tuple(name for name in rule.at_least_one_of if name in state.working)
        for rule in plan.keep
        if isinstance(rule, KeepGroup)
    ]

    def lawful(names: tuple[str, ...]) -> bool:
        """A subset that keep rules and products allow."""
        return (
            all(name in names for name in always)
            and all(not group or any(name in names for name in group) for group in groups)
            and all(part in names for name in names for part in keeping.parts(name))
        )

    best = bench.best_subset(bench.design(state), plan.alpha, lawful)
    if best is None:
        for name in state.working:
            rulings.add("selection.method", name, "no_subset", fits=(fitted.id,))
        leavers: tuple[str, ...] = tuple(name for name in state.working if name not in always)
    else:
        leavers = tuple(name for name in state.working if name not in best.names)
    for name in leavers:
        evidence = {"p": fitted.p_of(name)}
        if best is not None:
            chosen = bench.fit(best, "best subset")
            evidence["adjusted_r_squared"] = chosen.fit.adjusted_r_squared
            fits: tuple[str, ...] = (fitted.id, chosen.id)
        else:
            fits = (fitted.id,)
        ruling = rulings.add("selection.method", name, "not_in_best_subset", fits=fits, evidence=evidence)
        state = state.leaves(name, step=STEP, ruling=ruling.id)
    return _close(state, plan, bench, rulings)


def _close(state: State, plan: Plan, bench: Bench, rulings: Rulings) -> State:
    """The model that stands, ruled on as a whole."""
    if state.working:
        fitted = bench.fit(bench.design(state), "selected model")
        for name in state.working:
            p = fitted.p_of(name)
            verdict = "stays" if fitted.significant(name, plan.alpha) else "stays_above_alpha"
            rulings.add(
                "alpha", name, verdict, fits=(fitted.id,), evidence={"p": p}, value=p, limit=plan.alpha
            )
    return state
