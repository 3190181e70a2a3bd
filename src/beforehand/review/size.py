"""What the size of a table allows: rows per coefficient and the smallest effect it can show.

Nothing here has seen an outcome; it is all a matter of rows, coefficients and predictors.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from beforehand.fit.power import detectable_f2, needed_n
from beforehand.plan import Plan
from beforehand.review.findings import Finding, caution, figure, listed, note, percent
from beforehand.steps.state import Model

# The usual convention for the power of a planned test (Cohen 1988).
POWER = 0.80

# Rows per coefficient below which selection and R² are in doubt: a common rule of thumb.
FEW_ROWS = 10.0

# Rows per coefficient below which coefficients, standard errors and intervals are in doubt too
# (Austin & Steyerberg 2015).
TOO_FEW_ROWS = 2.0

# Up to so many rows HC3 is advised from the start where spread may be unequal (Long & Ervin 2000).
SMALL_TABLE = 250


@dataclass(frozen=True, slots=True, kw_only=True)
class ColumnCount:
    """Coefficients that one predictor or product has in the full model."""

    predictor: str
    columns: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Overlap:
    """The smallest effect that can be shown for one predictor, given its overlap with the others.

    Attributes
    ----------
    inflation : float
        Variance inflation factor among the predictors, 1 or more.
    per_sd : float
        In units of the outcome per standard deviation of the predictor.
    """

    predictor: str
    inflation: float
    per_sd: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Detectable:
    """The smallest effect of one coefficient that the full model finds with the stated power.

    Attributes
    ----------
    alpha, power : float
    n, p : int
        Complete rows, coefficients with the intercept.
    partial_f2 : float
        Cohen's effect size, by the noncentral F distribution.
    share_of_remaining : float
        The share of the variation left by the other predictors that the effect explains,
        ``f2 / (1 + f2)``.
    per_sd : float or None
        In units of the outcome per standard deviation of a predictor unrelated to the others;
        None without ``expects.residual_sd`` or without an intercept.
    by_predictor : tuple of Overlap
        The same for each predictor of one column; empty where ``per_sd`` is None.
    rows_needed : int or None
        Rows that the smallest effect that matters would need, for a predictor unrelated to the
        others; None where the plan does not state what that takes.
    """

    alpha: float
    power: float
    n: int
    p: int
    partial_f2: float
    share_of_remaining: float
    per_sd: float | None
    by_predictor: tuple[Overlap, ...]
    rows_needed: int | None


def column_counts(model: Model) -> tuple[ColumnCount, ...]:
    """Coefficients of each predictor and product of the full model, in plan order."""
    return tuple(ColumnCount(predictor=term.name, columns=len(term.keys)) for term in model.terms)


def detectable(plan: Plan, n: int, p: int, inflation: Sequence[tuple[str, float]]) -> Detectable | None:
    """The smallest effect that ``n`` rows can show beside ``p - 1`` other coefficients.

    Parameters
    ----------
    n, p : int
        Complete rows; coefficients of the full model with the intercept.
    inflation : sequence of (predictor, float)
        Variance inflation of each predictor of one column.

    Returns
    -------
    Detectable or None
        None where no residual degree of freedom is left, or where no effect of a practical size
        would be found.
    """
    if plan.alpha >= POWER:
        return None
    f2 = detectable_f2(n=n, p=p, df=1, alpha=plan.alpha, power=POWER)
    if f2 is None:
        return None
    sd = plan.expects.residual_sd if plan.expects is not None else None
    smallest = plan.outcome.smallest_effect_that_matters
    per_sd: float | None = None
    by_predictor: tuple[Overlap, ...] = ()
    rows_needed: int | None = None
    if sd is not None and plan.intercept:
        # The noncentrality f2·n equals b²·(n − 1)·s²/(σ²·VIF), with s the predictor's SD.
        per_sd = sd * math.sqrt(f2 * n / (n - 1))
        by_predictor = tuple(
            Overlap(predictor=name, inflation=vif, per_sd=per_sd * math.sqrt(vif)) for name, vif in inflation
        )
        if smallest:
            rows_needed = needed_n(partial_f2=(smallest / sd) ** 2, p=p, df=1, alpha=plan.alpha, power=POWER)
    return Detectable(
        alpha=plan.alpha,
        power=POWER,
        n=n,
        p=p,
        partial_f2=f2,
        share_of_remaining=f2 / (1.0 + f2),
        per_sd=per_sd,
        by_predictor=by_predictor,
        rows_needed=rows_needed,
    )


def size_findings(plan: Plan, n: int, p: int, effect: Detectable | None) -> Iterator[Finding]:
    """What a reviewer should know of the size of the table."""
    if n <= p:
        yield caution(
            "too-few-rows", "predictors",
            f"{n:,} complete rows cannot carry {p:,} coefficients: nothing is left to judge them by.",
        )  # fmt: skip
    elif p and n < TOO_FEW_ROWS * p:
        yield caution(
            "rows-per-coefficient", "predictors",
            f"{n / p:.1f} rows per coefficient: below {TOO_FEW_ROWS:g} even coefficients, standard errors "
            "and intervals are in doubt (Austin and Steyerberg, 2015).",
        )  # fmt: skip
    elif p and n < FEW_ROWS * p:
        yield note(
            "rows-per-coefficient", "predictors",
            f"{n / p:.1f} rows per coefficient: below {FEW_ROWS:g}, a common rule of thumb, selection is "
            "unstable and R² flatters.",
        )  # fmt: skip
    if 0 < n <= SMALL_TABLE and plan.errors == "classical":
        yield note(
            "small-table-errors", "errors",
            f"With {n:,} rows, errors: hc3 from the start is the safer choice where spread may be unequal: "
            f"up to {SMALL_TABLE} rows a test of spread misses too often (Long and Ervin, 2000).",
        )  # fmt: skip
    if effect is not None:
        yield from _effect_findings(plan, effect)


def _effect_findings(plan: Plan, effect: Detectable) -> Iterator[Finding]:
    """The smallest effect that can be shown, against the smallest that matters."""
    yield note(
        "detectable-effect", "alpha",
        f"One coefficient is found with power {effect.power:g} at alpha {effect.alpha:g} if it explains "
        f"{percent(effect.share_of_remaining)} of the variation that the other predictors leave.",
    )  # fmt: skip
    smallest = plan.outcome.smallest_effect_that_matters
    if effect.per_sd is None:
        return
    unit = f" {plan.outcome.unit}" if plan.outcome.unit else ""
    clause = "outcome.smallest_effect_that_matters"
    if smallest is None:
        yield note(
            "detectable-in-units", "expects.residual_sd",
            f"With the expected typical error that is {figure(effect.per_sd)}{unit} per SD of a predictor "
            "unrelated to the others.",
        )  # fmt: skip
        return
    if smallest < effect.per_sd:
        needed = (
            "no practical number of rows would do"
            if effect.rows_needed is None
            else f"about {effect.rows_needed:,} complete rows would do"
        )
        yield caution(
            "effect-too-small", clause,
            f"The table shows effects from {figure(effect.per_sd)}{unit} per SD, and effects from "
            f"{figure(smallest)}{unit} matter: one that matters can be missed; {needed}.",
        )  # fmt: skip
        return
    yield note(
        "effect-large-enough", clause,
        f"The table shows effects from {figure(effect.per_sd)}{unit} per SD of a predictor unrelated to the "
        f"others, and effects from {figure(smallest)}{unit} matter.",
    )  # fmt: skip
    hidden = [one.predictor for one in effect.by_predictor if one.per_sd > smallest]
    if hidden:
        yield caution(
            "effect-hidden-by-overlap", clause,
            f"The overlap with other predictors hides an effect of {figure(smallest)}{unit} per SD of "
            f"{listed(hidden)}.",
        )  # fmt: skip
