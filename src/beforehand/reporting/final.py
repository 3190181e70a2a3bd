"""The final model: its table beside the unadjusted and the full one, how firm it is, what else was tried."""

from __future__ import annotations

import math

from beforehand.fit.robustness import robustness_of
from beforehand.lock import AnswerTerm, FitRecord
from beforehand.reporting import words
from beforehand.reporting.context import Context
from beforehand.reporting.details import columns_of
from beforehand.reporting.document import (
    Block,
    Column,
    Grid,
    Listing,
    Picture,
    Said,
    Section,
    paragraph,
    section,
)
from beforehand.screen.alternatives import status_word
from beforehand.screen.digits import beside, figure, p_phrase, p_text, percent
from beforehand.screen.finding import per
from beforehand.screen.shares import number_text


def answer_section(context: Context) -> Section | None:
    """The final table, each predictor alone and in the full model beside it, and the fit as a whole."""
    answer, plan = context.lock.answer, context.plan
    if answer is None or context.lock.status == "mean_only":
        return None
    full = next((fit for fit in context.lock.fits if fit.id == answer.full_model), None)
    alone = {one.predictor: one.alone for one in answer.predictors}
    lost = {one.predictor: one.semipartial_r_squared for one in answer.predictors}
    rows: list[tuple[str, ...]] = []
    for term in answer.terms:
        size, low, high = beside((term.coefficient, term.low, term.high), term.standard_error)
        by_itself = alone.get(term.predictor or "")
        single = by_itself is not None and by_itself.coefficient is not None
        rows.append(
            (
                term.term,
                per(term, plan),
                size,
                beside((term.standard_error,), term.standard_error)[0],
                figure(term.t) if term.t is not None else "",
                p_text(term.p, plan.alpha) if term.p is not None else "",
                f"{low} to {high}",
                figure(term.standardized) if term.standardized is not None else "",
                _added(lost.get(term.predictor or ""), term, context),
                beside((by_itself.coefficient,), term.standard_error)[0] if single and by_itself else "",
                _in_full(full, term),
            )
        )
    heads = (
        "Term", "Per", "Coefficient", "Standard error", "t", "p", words.interval_title(plan.level),
        "Standardized", "R² it adds", "Alone", "Full model",
    )  # fmt: skip
    table = Grid(
        caption=f"The final model of {plan.outcome}, adjusted beside unadjusted",
        columns=columns_of(heads, rows, left=2),
        note=f"{words.ERRORS.get(answer.errors, answer.errors).capitalize()}. Alone is the coefficient of "
        "the predictor by itself on the same rows.",
    )
    facts = [
        ("Rows used", f"{answer.rows:,}"),
        ("Variance explained (R²)", percent(answer.r_squared) if answer.r_squared is not None else ""),
        ("Adjusted R²", figure(answer.adjusted_r_squared)),
        ("R² for rows left out one by one", figure(answer.predicted_r_squared)),
        ("Typical error", f"{figure(answer.residual_sd)} {plan.unit}".strip()),
        ("F of the model", _f(answer.f, answer.f_df, p_phrase(answer.f_p, plan.alpha))),
        ("AIC", figure(answer.aic)),
        ("BIC", figure(answer.bic)),
    ]
    if full is not None and full.r_squared is not None:
        facts.append((f"R² of the full model ({full.id})", percent(full.r_squared)))
    whole = Grid(caption="The fit as a whole", columns=columns_of(("What", "Value"), facts, left=2))
    return section("answer", words.TITLES["answer"], [table, whole])


def _added(share: float | None, term: AnswerTerm, context: Context) -> str:
    """The share of variation that a predictor adds, beside its first term."""
    return percent(share) if share is not None and _first(term, context) else ""


def _first(term: AnswerTerm, context: Context) -> bool:
    """Whether a term is the first of its predictor, beside which what the predictor adds is told."""
    assert context.lock.answer is not None
    own = [one for one in context.lock.answer.terms if one.predictor == term.predictor]
    return own[0] is term or own[0] == term


def _in_full(full: FitRecord | None, term: AnswerTerm) -> str:
    """The same coefficient in the model before selection."""
    if full is None:
        return ""
    found = next((one for one in full.terms if one.term == term.term), None)
    return (
        "" if found is None else beside((found.coefficient,), found.standard_error or term.standard_error)[0]
    )


def _f(f: float | None, df: tuple[int, int] | None, p: str) -> str:
    return (
        "" if f is None or df is None else f"{figure(f)} on {df[0]:,} and {df[1]:,} degrees of freedom, {p}"
    )


def pictures_section(context: Context) -> Section | None:
    """The final model in pictures; those that there is nothing for are left out later."""
    names = ("coefficients", "contributions", "straight", "spread", "normal", "pull")
    return section("pictures", words.TITLES["pictures"], [Picture(name) for name in names])


def honest_section(context: Context) -> Section | None:
    """Figures as computed from the rows that chose the model, beside those of the whole procedure."""
    made = context.rehearsal
    answer = context.lock.answer
    if made is None or made.scenarios.resample is None or answer is None:
        return None
    boot = made.scenarios.resample.bootstrap
    rows: list[tuple[str, str, str]] = []
    if boot.r_squared.apparent is not None:
        rows.append(("R²", figure(boot.r_squared.apparent), number_text(boot.r_squared.corrected)))
    held = made.scenarios.hold_out
    if held is not None and held.r_squared is not None:
        apparent = boot.r_squared.apparent
        rows.append(("R² on rows held out", figure(apparent), number_text(held.r_squared)))
    for term in answer.terms:
        own = boot.intervals.get(term.term)
        ends = None if own is None else own.bias_corrected or own.percentile
        if ends is None or term.low is None or term.high is None:
            continue
        low, high, honest_low, honest_high = beside((term.low, term.high, *ends), term.standard_error)
        rows.append((f"{term.term}, interval", f"{low} to {high}", f"{honest_low} to {honest_high}"))
    table = Grid(
        caption="As if the model had been given, and with its selection counted",
        columns=columns_of(("Figure", "Naive", "Honest"), rows, left=1),
        note=f"From {made.replicates:,} rehearsals of the whole plan on rows drawn with replacement.",
    )
    slope = boot.calibration_slope
    said = None
    if slope is not None:
        said = paragraph(
            Said(
                f"The calibration slope is {number_text(slope)}: below 1, predictions are too far from "
                "the mean."
            )
        )
    return section("honest", words.TITLES["honest"], [table if rows else None, said])


def fragile_section(context: Context) -> Section | None:
    """The ruling nearest to flipping, knife edges, near misses, and unseen common causes."""
    lock, answer, plan = context.lock, context.lock.answer, context.plan
    if answer is None:
        return None
    says = {ruling.id: ruling.says for ruling in lock.rulings}
    items = []
    if answer.fragility is not None:
        items.append(Said(answer.fragility.says, (answer.fragility.ruling,)))
    items += [
        Said(f"Rounding alone could turn this: {says.get(one, '')}", (one,)) for one in answer.knife_edges
    ]
    for miss in answer.near_misses:
        needs = "no sample of a practical size" if miss.rows_needed is None else f"{miss.rows_needed:,} rows"
        items.append(
            Said(
                f"{miss.predictor} nearly showed ({p_phrase(miss.p, plan.alpha)}); "
                f"its effect would need {needs}."
            )
        )
    for entry in answer.sign_contradictions:
        said = f"{entry.predictor} should be {entry.expected} and is {figure(entry.coefficient)}."
        items.append(Said(f"{said} {entry.because}".strip()))
    return section("fragile", words.TITLES["fragile"], [Listing(tuple(items)), Listing(_unseen(context))])


def _unseen(context: Context) -> tuple[Said, ...]:
    """Robustness values of the focal predictors; of all where none is focal (Cinelli & Hazlett 2020)."""
    answer, plan = context.lock.answer, context.plan
    if answer is None or answer.f_df is None or answer.fit is None:
        return ()
    lost = {one.predictor: one.semipartial_r_squared for one in answer.predictors}
    df = answer.rows - len(answer.terms)
    single = [term for term in answer.terms if term.predictor and term.t is not None and term.level is None]
    focal = [term for term in single if plan.roles.get(term.predictor or "") == "focal"] or single
    made = []
    for term in focal[:8]:
        share = lost.get(term.predictor or "")
        if term.p is None or term.p > plan.alpha or share is None or df < 2 or not answer.r_squared:
            continue
        # t by classical errors, whatever errors the table has: from what R² loses without the predictor.
        t = math.sqrt(df * share / (1.0 - answer.r_squared)) if answer.r_squared < 1.0 else math.inf
        if not math.isfinite(t):
            continue
        found = robustness_of(t, df, alpha=plan.alpha)
        said = words.robust_to_unseen(
            term.predictor or term.term, found.value, found.value_at_alpha, plan.alpha
        )
        made.append(Said(said, (answer.fit,)))
    return tuple(made)


def alternatives_section(context: Context) -> Section | None:
    """The plan beside its declared alternatives."""
    lock = context.lock
    if not lock.alternatives:
        return None
    rows = []
    for name, status, answer, holds in (
        ("as planned", lock.status, lock.answer, ""),
        *(
            (key, one.status, one.answer, "yes" if one.holds else "no")
            for key, one in lock.alternatives.items()
        ),
    ):
        explained = "" if answer is None or answer.r_squared is None else percent(answer.r_squared)
        used = "" if answer is None else f"{answer.rows:,}"
        among = "" if answer is None else f"{len(answer.predictors)}"
        rows.append((name, status_word(status), holds, among, used, explained))
    heads = ("Run", "It came to", "Answer holds", "Predictors", "Rows used", "Variance explained")
    items = [
        Said(f"{name}: {' '.join(other.differences)}")
        for name, other in lock.alternatives.items()
        if other.differences
    ]
    return section(
        "alternatives",
        words.TITLES["alternatives"],
        [
            Grid(caption="Side by side", columns=columns_of(heads, rows, left=3)),
            _terms(context),
            Listing(tuple(items)),
        ],
    )


def _terms(context: Context) -> Block:
    """Each coefficient in every run."""
    lock = context.lock
    answers = [("as planned", lock.answer), *((name, one.answer) for name, one in lock.alternatives.items())]
    names = list(
        dict.fromkeys(term.term for _, answer in answers if answer is not None for term in answer.terms)
    )
    columns = [Column(head="Term", cells=tuple(names), align="left")]
    for name, answer in answers:
        own = {} if answer is None else {term.term: term for term in answer.terms}
        cells = tuple(
            beside((own[term].coefficient,), own[term].standard_error)[0] if term in own else ""
            for term in names
        )
        columns.append(Column(head=name, cells=cells))
    return Grid(caption="Coefficients in each run", columns=tuple(columns))
