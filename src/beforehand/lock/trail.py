"""The trail of a run: rows at each stage, what left and why, every ruling and every fit."""

from __future__ import annotations

from collections.abc import Mapping
from typing import ClassVar, Literal

from pydantic import Field

from beforehand.lock.record import CheckId, Count, Digest, Figure, FitId, Name, Record, RulingId, Scalar


class LedgerStage(Record):
    """Rows at one stage of the run."""

    stage: str = Field(description="Name of the stage.")
    rows: Count = Field(description="Rows left at its end.")
    because: str | None = Field(description="The plan's reason for it.")


class RowRemoved(Record):
    """A row that left in a step."""

    row: str = Field(description="Label of the row.")
    step: str = Field(description="Step in which it left.")
    ruling: RulingId = Field(description="Ruling by which it left.")


class PredictorFate(Record):
    """How a predictor ended."""

    verdict: Literal["adopted", "removed", "in_model"] = Field(
        description="In the adopted model, removed, or in the model of a run that adopted none."
    )
    ruling: RulingId | None = Field(description="The ruling that decided it.")
    transform: str | None = Field(description="Rung of the ladder under which it stands or stood.")
    exponent: Figure | None = Field(description="Learned exponent of a Box-Cox power.")
    says: str = Field(description="The same in a sentence.")


class RulingRecord(Record):
    """One decision: what it rests on, how far it was from its limit, what it says."""

    id: RulingId = Field(description="Number, in the order of the run.")
    step: str = Field(description="Step that made it.")
    clause: str = Field(description="Place in the plan on which it rests.")
    subject: str = Field(description="Predictor, row or check that it is about.")
    fits: tuple[FitId, ...] = Field(description="Fits on which it rests.")
    checks: tuple[CheckId, ...] = Field(description="Checks on which it rests.")
    evidence: Mapping[Name, Scalar] = Field(description="Named numbers of the evidence.")
    limit: Figure | None = Field(description="The limit in the plan.")
    margin: Figure | None = Field(description="Distance of the evidence from the limit.")
    knife_edge: bool = Field(description="Whether the margin is within the rounding of the evidence.")
    verdict: str = Field(description="What was decided, in one word such as keep, remove, transform or stop.")
    ground: str = Field(description="The ground on which it was decided, as a code.")
    because: str | None = Field(description="The plan's own reason, where one decided.")
    says: str = Field(description="The same in a sentence.")


class FitRows(Record):
    """The rows of a fit."""

    n: Count = Field(description="Rows used.")
    digest: Digest = Field(description="Digest of their labels in canonical order.")


class FitOutcome(Record):
    """The outcome of a fit and its scale."""

    column: str = Field(description="Column of the outcome.")
    transform: str = Field(description="Rung of the ladder; identity for none.")
    exponent: Figure | None = Field(description="Learned exponent of a Box-Cox power.")


class FitTerm(Record):
    """One coefficient of a fit."""

    left_out: ClassVar[frozenset[str]] = frozenset({"transform", "exponent", "level"})

    term: str = Field(description="Name of the term: intercept, a predictor, a level or a product.")
    predictor: str | None = Field(description="Predictor of the plan to which it belongs.")
    transform: str | None = Field(
        default=None, description="Rung of the ladder under which the predictor stands."
    )
    exponent: Figure | None = Field(default=None, description="Learned exponent of a Box-Cox power.")
    level: str | None = Field(default=None, description="Level of a category whose indicator this is.")
    coefficient: Figure = Field(description="Estimate, in units of the fitted outcome per unit of the term.")
    standard_error: Figure | None = Field(description="Standard error by the errors of the fit.")
    t: Figure | None = Field(description="Coefficient over its standard error.")
    p: Figure | None = Field(description="Two-sided p of t.")


class FitTest(Record):
    """The test of one predictor as a whole."""

    predictor: str = Field(description="Name of the predictor.")
    df: Count = Field(description="Columns it takes in the design.")
    statistic: Figure | None = Field(description="|t| for one column, partial F for a block.")
    p: Figure | None = Field(description="p of the statistic.")


class FitRecord(Record):
    """One fit: identified by rows, outcome scale, terms and errors."""

    id: FitId = Field(description="Number, in the order first asked for.")
    step: str = Field(description="Step that first asked for it.")
    why: str = Field(description="What it was asked for.")
    rows: FitRows = Field(description="Rows used.")
    outcome: FitOutcome = Field(description="Outcome and its scale.")
    errors: str = Field(description="Kind of standard errors.")
    terms: tuple[FitTerm, ...] = Field(description="Coefficients, the intercept first.")
    tests: tuple[FitTest, ...] = Field(description="Predictors judged as a whole.")
    r_squared: Figure | None = Field(description="Share of variance explained.")
    adjusted_r_squared: Figure | None = Field(description="R² adjusted for the number of coefficients.")
    residual_sd: Figure | None = Field(description="Residual standard deviation.")
    f: Figure | None = Field(description="F of the test that all slopes are zero.")
    f_df: tuple[int, int] | None = Field(description="Degrees of freedom of F.")
    f_p: Figure | None = Field(description="p of F.")
    aic: Figure | None = Field(description="Akaike's criterion.")
    bic: Figure | None = Field(description="Schwarz's criterion.")
    exact: bool = Field(description="Whether the residuals vanish to the precision of the table.")
