"""The transforms step: a ladder is climbed only by what fails a declared check.

Each rung replaces the predictor, is refitted and checked again; the first rung that passes is
adopted for good (the rule of design: one change at a time, every change followed by a refit).
"""

from __future__ import annotations

from dataclasses import replace

from beforehand.fit.exponents import NoExponent
from beforehand.fit.sweeping import RankDeficient
from beforehand.plan import Plan
from beforehand.steps.bench import Bench, Checked, Fitted
from beforehand.steps.keeping import Keeping
from beforehand.steps.rulings import Ruling, Rulings
from beforehand.steps.state import State, Transform

STEP = "transforms"


def transforms(state: State, plan: Plan, bench: Bench) -> tuple[State, tuple[Ruling, ...]]:
    """Hold every numeric predictor, and the outcome where it has a ladder, to its checks."""
    rulings = Rulings(STEP, state.rulings_made)
    if plan.outcome.transforms:
        state = _outcome(state, plan, bench, rulings)
    for predictor in plan.predictors:
        if predictor.kind == "number" and predictor.column in state.working:
            state = _predictor(predictor.column, state, plan, bench, rulings)
    return replace(state, rulings_made=rulings.count), tuple(rulings.made)


def _predictor(name: str, state: State, plan: Plan, bench: Bench, rulings: Rulings) -> State:
    """One predictor: its checks, then the ladder when one of them fails."""
    model = bench.design(state)
    if bench.two_valued(name, model.rows):
        rulings.add("transforms.when", name, "two_valued")
        return state
    fitted = bench.fit(model, "working model")
    checks = _checks(fitted, name, plan, bench)
    failed = [check for check in checks if check.failed]
    if not failed:
        _rule(rulings, "transforms.when", name, "straight" if checks else "unchecked", fitted, checks)
        return state
    _rule(rulings, "transforms.when", name, "bent", fitted, failed)
    for rung in plan.transforms.try_:
        mended = _climb(name, rung, state, plan, bench, rulings)
        if mended is not None:
            return mended
    return _unmended(name, state, plan, bench, rulings, fitted)


def _climb(name: str, rung: str, state: State, plan: Plan, bench: Bench, rulings: Rulings) -> State | None:
    """Try one rung; the state with it adopted, or None."""
    model = bench.design(state)
    reason = bench.domain(name, rung, model.rows)
    if reason:
        rulings.add("transforms.try", name, "rung_not_applicable", evidence={"rung": rung}, because=reason)
        return None
    transform = bench.learn(model, name, rung)
    trial = replace(state, transforms={**state.transforms, name: transform})
    try:
        fitted = bench.fit(bench.design(trial), f"{name} under {rung}")
    except RankDeficient as error:
        rulings.add(
            "transforms.try", name, "rung_not_applicable", evidence={"rung": rung}, because=str(error)
        )
        return None
    checks = _checks(fitted, name, plan, bench)
    failed = [check for check in checks if check.failed]
    evidence: dict[str, str | float] = {"rung": rung}
    if rung == "box_cox":
        evidence["exponent"] = transform.exponent
    if failed:
        _rule(rulings, "transforms.try", name, "rung_fails", fitted, failed, evidence)
        return None
    _rule(rulings, "transforms.try", name, "rung_adopted", fitted, checks, evidence)
    return trial


def _unmended(name: str, state: State, plan: Plan, bench: Bench, rulings: Rulings, fitted: Fitted) -> State:
    """No rung passes: the predictor leaves, or stays as it is when the plan or a keep rule says so."""
    p = fitted.p_of(name)
    state = replace(state, unmended=(*state.unmended, name))
    if plan.transforms.if_none_works == "keep_as_is":
        rulings.add("transforms.if_none_works", name, "stays_unmended", fits=(fitted.id,))
        return state
    hold = Keeping(plan).hold(name, state.working, p)
    if hold is not None:
        rulings.add(
            hold.clause, name, hold.ground, fits=(fitted.id,), evidence={"p": p},
            value=p, limit=hold.limit, because=hold.because,
        )  # fmt: skip
        return state
    ruling = rulings.add("transforms.if_none_works", name, "leaves_unmended", fits=(fitted.id,))
    left = state.leaves(name, step=STEP, ruling=ruling.id)
    return replace(left, unmended=tuple(other for other in left.unmended if other != name))


def _checks(fitted: Fitted, name: str, plan: Plan, bench: Bench) -> list[Checked]:
    """The checks that call the ladder, for one predictor in one fit."""
    made: list[Checked] = []
    for kind in plan.transforms.when:
        if kind == "curvature" and plan.assumptions.curvature != "skip":
            made.append(bench.curvature(fitted, name, plan.assumptions.curvature.alpha))
        if kind == "spread" and plan.assumptions.equal_spread != "skip":
            made.append(bench.spread(fitted, name, "breusch_pagan", plan.assumptions.equal_spread.alpha))
    return made


def _outcome(state: State, plan: Plan, bench: Bench, rulings: Rulings) -> State:
    """The outcome's own ladder, when spread or normality fails on the full model."""
    fitted = bench.fit(bench.design(state), "full model")
    name = plan.outcome.column
    checks = _outcome_checks(fitted, plan, bench)
    failed = [check for check in checks if check.failed]
    if not failed:
        _rule(rulings, "outcome.transforms", name, "outcome_stays", fitted, checks)
        return state
    _rule(rulings, "outcome.transforms", name, "outcome_fails", fitted, failed)
    for rung in plan.outcome.transforms:
        model = bench.design(state)
        reason = bench.domain("", rung, model.rows)
        if reason:
            rulings.add(
                "outcome.transforms", name, "rung_not_applicable", evidence={"rung": rung}, because=reason
            )
            continue
        try:
            transform: Transform = bench.learn(model, "", rung)
        except NoExponent as error:
            rulings.add(
                "outcome.transforms", name, "rung_not_applicable", evidence={"rung": rung}, because=str(error)
            )
            continue
        trial = replace(state, outcome=transform)
        fitted = bench.fit(bench.design(trial), f"outcome under {rung}")
        checks = _outcome_checks(fitted, plan, bench)
        failed = [check for check in checks if check.failed]
        evidence: dict[str, str | float] = {"rung": rung}
        if rung == "box_cox":
            evidence["exponent"] = transform.exponent
        if not failed:
            _rule(rulings, "outcome.transforms", name, "rung_adopted", fitted, checks, evidence)
            return trial
        _rule(rulings, "outcome.transforms", name, "rung_fails", fitted, failed, evidence)
    rulings.add("outcome.transforms", name, "outcome_unmended")
    return state


def _outcome_checks(fitted: Fitted, plan: Plan, bench: Bench) -> list[Checked]:
    """Spread and normality of the residuals, as the plan declares them."""
    made: list[Checked] = []
    spread, normal = plan.assumptions.equal_spread, plan.assumptions.normal_residuals
    if spread != "skip":
        made.append(bench.spread(fitted, None, spread.test, spread.alpha))
    if normal != "skip":
        made.append(bench.normality(fitted, normal.test, normal.alpha))
    return made


def _rule(
    rulings: Rulings,
    clause: str,
    subject: str,
    verdict: str,
    fitted: Fitted,
    checks: list[Checked],
    evidence: dict[str, str | float] | None = None,
) -> None:
    """A ruling that rests on checks: the one nearest to its level is the evidence."""
    numbers: dict[str, float | str | int | bool | None] = dict(evidence or {})
    for check in checks:
        numbers[f"p_{check.check.name}"] = check.check.p
    made = [check for check in checks if check.check.p is not None]
    nearest = min(made, key=lambda check: abs((check.check.p or 0.0) - check.alpha), default=None)
    rulings.add(
        clause,
        subject,
        verdict,
        fits=(fitted.id,),
        checks=tuple(check.id for check in checks),
        evidence=numbers,
        value=None if nearest is None else nearest.check.p,
        limit=None if nearest is None else nearest.alpha,
    )
