"""The answer of a run: the final table, its fit, and what a reader must know beside it."""

from __future__ import annotations

from typing import Literal

from pydantic import Field

from beforehand.lock.record import Count, Figure, FitId, Record, RulingId


class AnswerOutcome(Record):
    """The outcome and the scale on which it was fitted."""

    column: str = Field(description="Column of the outcome.")
    unit: str | None = Field(description="Unit of the outcome as read.")
    transform: str = Field(description="Rung of the ladder on which it was fitted; identity for none.")
    exponent: Figure | None = Field(description="Learned exponent of a Box-Cox power.")
    smearing: Figure | None = Field(
        description="Duan's (1983) smearing estimate over the plain way back to the unit, at the mean."
    )


class AnswerTerm(Record):
    """One coefficient of the final table."""

    term: str = Field(description="Name of the term: intercept, a predictor, a level or a product.")
    predictor: str | None = Field(description="Predictor of the plan to which it belongs.")
    transform: str | None = Field(description="Rung of the ladder under which the predictor stands.")
    exponent: Figure | None = Field(description="Learned exponent of a Box-Cox power.")
    level: str | None = Field(description="Level of a category whose indicator this is.")
    unit: str | None = Field(description="Unit of the predictor as read.")
    coefficient: Figure = Field(description="Estimate, in units of the fitted outcome per unit of the term.")
    standard_error: Figure | None = Field(description="Standard error by the errors in force.")
    t: Figure | None = Field(description="Coefficient over its standard error.")
    p: Figure | None = Field(description="Two-sided p of t.")
    low: Figure | None = Field(description="Lower end of the interval at 1 - alpha.")
    high: Figure | None = Field(description="Upper end of the interval at 1 - alpha.")
    standardized: Figure | None = Field(description="Coefficient in standard deviations of both sides.")
    adjusted_p: Figure | None = Field(description="p adjusted for multiplicity over focal predictors.")


class Alone(Record):
    """A predictor by itself, unadjusted for the others."""

    fit: FitId = Field(description="The fit with this predictor only.")
    coefficient: Figure | None = Field(description="Its coefficient; null for a block of columns.")
    p: Figure | None = Field(description="Its p in that fit.")


class AnswerPredictor(Record):
    """One predictor of the final model judged as a whole."""

    predictor: str = Field(description="Name of the predictor.")
    df: Count = Field(description="Columns it takes in the design.")
    statistic: Figure | None = Field(description="|t| for one column, partial F for a block.")
    p: Figure | None = Field(description="p of the statistic.")
    semipartial_r_squared: Figure | None = Field(description="R² lost when it alone is left out.")
    adjusted_p: Figure | None = Field(description="p adjusted for multiplicity over focal predictors.")
    alone: Alone | None = Field(description="The same predictor by itself, unadjusted.")


class Mean(Record):
    """The mean model, where it is the answer."""

    mean: Figure = Field(description="Mean of the fitted outcome.")
    low: Figure | None = Field(description="Lower end of its interval at 1 - alpha.")
    high: Figure | None = Field(description="Upper end of its interval at 1 - alpha.")
    sd: Figure | None = Field(description="Standard deviation of the fitted outcome.")


class NearMiss(Record):
    """A predictor that nearly reached alpha in a weak model."""

    predictor: str = Field(description="Name of the predictor.")
    p: Figure = Field(description="Its p.")
    partial_f2: Figure | None = Field(description="Observed partial f² (Cohen 1988).")
    rows_needed: Count | None = Field(description="Rows its effect would need for power 0.80; null for none.")


class SignContradiction(Record):
    """A kept predictor whose sign is not the expected one."""

    predictor: str = Field(description="Name of the predictor.")
    expected: Literal["positive", "negative"] = Field(description="Sign that the plan expects.")
    coefficient: Figure = Field(description="Coefficient found.")
    p: Figure | None = Field(description="Its p.")
    because: str = Field(description="The plan's reason for the expectation.")


class Fragility(Record):
    """The ruling that was nearest to flipping."""

    ruling: RulingId = Field(description="Number of the ruling.")
    margin: Figure = Field(description="Its margin relative to the limit.")
    says: str = Field(description="The same in a sentence.")


class Answer(Record):
    """What the run comes to."""

    fit: FitId | None = Field(description="The final fit.")
    outcome: AnswerOutcome = Field(description="Outcome and its fitted scale.")
    equation: str = Field(description="The equation in plain words.")
    errors: str = Field(description="Kind of standard errors in the table.")
    terms: tuple[AnswerTerm, ...] = Field(description="Coefficients, the intercept first.")
    predictors: tuple[AnswerPredictor, ...] = Field(description="Predictors as a whole, in plan order.")
    rows: Count = Field(description="Rows used.")
    r_squared: Figure | None = Field(description="Share of variance explained in these rows.")
    adjusted_r_squared: Figure | None = Field(description="R² adjusted for the number of coefficients.")
    predicted_r_squared: Figure | None = Field(description="R² when each row is predicted without itself.")
    press: Figure | None = Field(description="Sum of squared leave-one-out residuals.")
    residual_sd: Figure | None = Field(description="Typical error: residual standard deviation.")
    f: Figure | None = Field(description="F of the test that all slopes are zero.")
    f_df: tuple[int, int] | None = Field(description="Degrees of freedom of F.")
    f_p: Figure | None = Field(description="p of F.")
    aic: Figure | None = Field(description="Akaike's criterion.")
    bic: Figure | None = Field(description="Schwarz's criterion.")
    share_explained: Figure | None = Field(description="Share of the outcome's variance explained.")
    share_unexplained: Figure | None = Field(description="Share left unexplained.")
    mean: Mean | None = Field(description="The mean model, where it is the answer.")
    near_misses: tuple[NearMiss, ...] = Field(description="Predictors that nearly reached alpha.")
    sign_contradictions: tuple[SignContradiction, ...] = Field(description="Signs against expectation.")
    full_model: FitId | None = Field(description="The model before selection.")
    knife_edges: tuple[RulingId, ...] = Field(description="Rulings that rounding alone could flip.")
    fragility: Fragility | None = Field(description="The ruling nearest to flipping.")
    cautions: tuple[str, ...] = Field(description="Cautions, the most important first.")
