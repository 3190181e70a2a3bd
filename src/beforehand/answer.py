"""The answer of a run: the final table with its intervals, and what must stand beside it."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from scipy.special import stdtrit

from beforehand import wording
from beforehand.fit.columns import Key
from beforehand.fit.ladder import smeared, undo
from beforehand.fit.multiplicity import benjamini_hochberg, holm
from beforehand.fit.results import Coefficient, Fit
from beforehand.lock import (
    Alone,
    Answer,
    AnswerOutcome,
    AnswerPredictor,
    AnswerTerm,
    Fragility,
    Mean,
    NearMiss,
    SignContradiction,
)
from beforehand.plan import KeepGroup
from beforehand.running import Trail
from beforehand.steps.bench import Fitted
from beforehand.steps.keeping import name_of
from beforehand.steps.rulings import Ruling
from beforehand.steps.state import IDENTITY, Model, Transform, column_name


def answer_of(trail: Trail) -> Answer | None:
    """What a run comes to; None where it stopped before a fit that could be shown."""
    final = trail.final
    if final is None:
        return None
    fit, model = final.fit, final.model
    adjusted = _adjusted(trail, final)
    terms = tuple(_term(c, trail, final, adjusted) for c in fit.coefficients)
    press, predicted = _leave_one_out(trail, final)
    is_mean = not model.terms
    fragility = _fragility(trail.rulings)
    return Answer(
        fit=final.id,
        outcome=_outcome(trail, final),
        equation=equation_of(trail, final),
        errors=fit.errors,
        terms=terms,
        predictors=tuple(_predictor(name, trail, final, adjusted) for name in model.names),
        rows=fit.n,
        r_squared=fit.r_squared,
        adjusted_r_squared=fit.adjusted_r_squared,
        predicted_r_squared=predicted,
        press=press,
        residual_sd=fit.residual_sd,
        f=fit.f,
        f_df=None if is_mean else fit.f_df,
        f_p=fit.f_p,
        aic=fit.aic,
        bic=fit.bic,
        share_explained=fit.r_squared,
        share_unexplained=1.0 - fit.r_squared,
        mean=_mean(terms[0], fit) if is_mean else None,
        near_misses=tuple(
            NearMiss(
                predictor=miss.predictor, p=miss.p, partial_f2=miss.partial_f2, rows_needed=miss.rows_needed
            )
            for miss in trail.state.near_misses
        ),
        sign_contradictions=_contradictions(trail, final),
        full_model=_full_model(trail),
        knife_edges=tuple(ruling.id for ruling in trail.rulings if ruling.knife_edge),
        fragility=fragility,
        cautions=cautions_of(trail, final),
    )


def term_name(key: Key | None) -> str:
    """Name of a coefficient in the record."""
    return column_name(key)


def owners_of(model: Model) -> list[str | None]:
    """The predictor of each coefficient, in the order of a fit; None for the intercept."""
    names: list[str | None] = [None] if model.intercept else []
    return names + [term.name for term in model.terms for _ in term.keys]


def transform_of(key: Key | None) -> tuple[str | None, float | None, str | None]:
    """Rung, exponent and level of a coefficient; None where it has none."""
    if key is None:
        return None, None, None
    rungs = [factor for factor in key.factors if factor.rung != "identity"]
    rung = " × ".join(factor.rung for factor in rungs) if rungs else None
    exponent = next((factor.exponent for factor in rungs if factor.rung == "box_cox"), None)
    levels = [factor.level for factor in key.factors if factor.level]
    return rung, exponent, " × ".join(levels) if levels else None


def shown_exponent(transform: Transform) -> float | None:
    """The exponent of a Box-Cox power; None for any other rung."""
    return transform.exponent if transform.rung == "box_cox" else None


def _term(coefficient: Coefficient, trail: Trail, final: Fitted, adjusted: dict[str, float]) -> AnswerTerm:
    """One coefficient with its interval at 1 - alpha and its standardized size."""
    fit, model = final.fit, final.model
    predictor = next((term.name for term in model.terms if coefficient.key in term.keys), None)
    rung, exponent, level = transform_of(coefficient.key)
    half = coefficient.standard_error * float(stdtrit(fit.df_inference, 1.0 - trail.plan.alpha / 2.0))
    standardized = None
    if coefficient.key is not None:
        moments = trail.bench.moments(model)
        spread = moments.sd(model.outcome)
        standardized = coefficient.estimate * moments.sd(coefficient.key) / spread if spread > 0 else None
    single = coefficient.key is not None and model.term(predictor or "").single
    return AnswerTerm(
        term=term_name(coefficient.key),
        predictor=predictor,
        transform=rung,
        exponent=exponent,
        level=level,
        unit=_unit(trail, coefficient.key),
        coefficient=coefficient.estimate,
        standard_error=coefficient.standard_error,
        t=coefficient.t,
        p=coefficient.p,
        low=coefficient.estimate - half,
        high=coefficient.estimate + half,
        standardized=standardized,
        adjusted_p=adjusted.get(predictor or "") if single else None,
    )


def _unit(trail: Trail, key: Key | None) -> str | None:
    """Unit of a number as read; None for levels, products and the intercept."""
    if key is None or len(key.factors) > 1 or key.factors[0].level:
        return None
    return next(p.unit for p in trail.plan.predictors if p.column == key.factors[0].column)


def _predictor(name: str, trail: Trail, final: Fitted, adjusted: dict[str, float]) -> AnswerPredictor:
    """One predictor as a whole, with the same predictor by itself beside it."""
    test = final.fit.tests[name]
    lost = None if test.partial_f2 is None else test.partial_f2 * (1.0 - final.fit.r_squared)
    return AnswerPredictor(
        predictor=name,
        df=test.df,
        statistic=test.statistic,
        p=test.p,
        semipartial_r_squared=lost,
        adjusted_p=adjusted.get(name),
        alone=_alone(name, trail, final),
    )


def _alone(name: str, trail: Trail, final: Fitted) -> Alone | None:
    """The predictor by itself on the same rows; a product has no meaning without its parts."""
    model = final.model
    if model.term(name).kind == "product":
        return None
    others = [other for other in model.names if other != name]
    alone = trail.bench.fit(model.without(*others), f"{name} alone")
    single = model.term(name).single
    return Alone(
        fit=alone.id,
        coefficient=alone.fit.coefficients[-1].estimate if single else None,
        p=alone.p_of(name),
    )


def _adjusted(trail: Trail, final: Fitted) -> dict[str, float]:
    """Adjusted p of the focal predictors in the final table; beside the plain p, steering nothing."""
    method = trail.plan.multiplicity
    if method == "none":
        return {}
    focal = [
        (p.column, final.fit.tests[p.column].p)
        for p in trail.plan.predictors
        if p.role == "focal" and p.column in final.model.names
    ]
    known = [(name, p) for name, p in focal if p is not None]
    adjust = holm if method == "holm" else benjamini_hochberg
    return dict(zip([name for name, _ in known], adjust([p for _, p in known]), strict=True))


def _leave_one_out(trail: Trail, final: Fitted) -> tuple[float | None, float | None]:
    """PRESS (Allen 1974) and the R² it implies; None where a row has leverage 1."""
    if final.fit.tss <= 0:
        return None, None
    press = trail.bench.values(final.model).press
    return press, None if press is None else 1.0 - press / final.fit.tss


def _outcome(trail: Trail, final: Fitted) -> AnswerOutcome:
    """The outcome, its scale, and what brings a prediction at the mean back to its unit."""
    transform = trail.state.outcome
    smearing = None
    if transform != IDENTITY:
        residuals = trail.bench.values(final.model).residual
        centre = trail.bench.moments(final.model).mean(final.model.outcome)
        estimate = smeared(transform.rung, centre, residuals, transform.exponent).mean
        plain = float(undo(transform.rung, np.array([centre]), transform.exponent)[0])
        # For a logarithm this is the mean of exp(residual), the same at every row.
        smearing = estimate / plain if estimate is not None and math.isfinite(plain) and plain else None
    return AnswerOutcome(
        column=trail.plan.outcome.column,
        unit=trail.plan.outcome.unit,
        transform=transform.rung,
        exponent=shown_exponent(transform),
        smearing=smearing,
    )


def equation_of(trail: Trail, final: Fitted) -> str:
    """The equation with numbers to three digits: ``kwh = 38.2 + 6.41 outdoor_temp``."""
    left = _under(trail.plan.outcome.column, trail.state.outcome.rung, shown_exponent(trail.state.outcome))
    parts: list[str] = []
    for coefficient in final.fit.coefficients:
        size = wording.number(abs(coefficient.estimate))
        name = "" if coefficient.key is None else " " + _key_words(coefficient.key)
        sign = "-" if coefficient.estimate < 0 else "+"
        if parts:
            parts.append(f"{sign} {size}{name}")
        else:
            parts.append(f"{'-' if sign == '-' else ''}{size}{name}")
    return f"{left} = {' '.join(parts)}"


def _key_words(key: Key) -> str:
    """A design column in the equation."""
    words = [
        f"({f.column} = {f.level})"
        if f.level
        else _under(f.column, f.rung, f.exponent if f.rung == "box_cox" else None)
        for f in key.factors
    ]
    return " × ".join(words)


_UNDER = {
    "identity": "{}",
    "square": "{}²",
    "cube": "{}³",
    "square_root": "√{}",
    "cube_root": "∛{}",
    "log": "log {}",
    "reciprocal": "1/{}",
}


def _under(column: str, rung: str, exponent: float | None) -> str:
    """A column under a rung, as arithmetic is written."""
    if rung == "box_cox":
        return f"boxcox({column}, {wording.number(exponent)})"
    return _UNDER[rung].format(column)


def _mean(term: AnswerTerm, fit: Fit) -> Mean:
    """The mean with its interval."""
    return Mean(mean=term.coefficient, low=term.low, high=term.high, sd=fit.residual_sd)


def _contradictions(trail: Trail, final: Fitted) -> tuple[SignContradiction, ...]:
    """Kept predictors whose coefficient has not the sign that the plan expects."""
    found: list[SignContradiction] = []
    by_key = {c.key: c for c in final.fit.coefficients if c.key is not None}
    for rule in trail.plan.keep:
        if isinstance(rule, KeepGroup) or rule.expected_sign is None:
            continue
        name = name_of(rule.predictor)
        if name not in final.model.names or not final.model.term(name).single:
            continue
        key = final.model.term(name).keys[0]
        coefficient = by_key[key]
        # A reciprocal turns a rising relation into a falling one, on either side.
        turns = sum(f.rung == "reciprocal" for f in key.factors) + (trail.state.outcome.rung == "reciprocal")
        effect = coefficient.estimate * (-1.0) ** turns
        if effect and (effect > 0) != (rule.expected_sign == "positive"):
            found.append(
                SignContradiction(
                    predictor=name,
                    expected=rule.expected_sign,
                    coefficient=coefficient.estimate,
                    p=coefficient.p,
                    because=rule.because,
                )
            )
    return tuple(found)


def _full_model(trail: Trail) -> str | None:
    """The number of the fit with which selection began."""
    model = trail.state.full_model
    if model is None or not model.terms:
        return None
    return trail.bench.fit(model, "full model").id


# Rulings that choose between ways: what they chose could have been otherwise.
def _decides(ruling: Ruling) -> bool:
    return ruling.margin is not None and bool(ruling.limit) and not ruling.ground.startswith("kept_always")


def _fragility(rulings: Sequence[Ruling]) -> Fragility | None:
    """The ruling whose evidence was nearest to its limit, relative to the limit."""
    deciding = [ruling for ruling in rulings if _decides(ruling)]
    if not deciding:
        return None
    nearest = min(deciding, key=lambda r: ((r.margin or 0.0) / abs(r.limit or 1.0), r.id))
    relative = (nearest.margin or 0.0) / abs(nearest.limit or 1.0)
    said = wording.sentence(nearest)
    return Fragility(
        ruling=nearest.id,
        margin=relative,
        says=f"Nearest to flipping is {nearest.id}, {wording.share(relative)} of its limit away: {said}",
    )


def cautions_of(trail: Trail, final: Fitted) -> tuple[str, ...]:
    """What a reader must know, the most pressing first, and what is always said."""
    return wording.cautions(
        status=trail.status,
        cap_reached=trail.state.cap_reached,
        exact=final.fit.exact,
        unmended=trail.state.unmended,
        failed=[ruling for ruling in trail.rulings if "_fails_" in ruling.ground],
        selected="selection" in trail.plan.steps and trail.plan.selection.method != "none",
        filled=bool(trail.base.fills),
        rows_per_coefficient=final.fit.n / final.fit.p,
        alternatives=len(trail.plan.alternatives),
    )
