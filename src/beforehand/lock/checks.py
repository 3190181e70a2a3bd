"""The checks of a run: descriptives, correlations, inflation, assumptions, influence."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Literal

from pydantic import Field

from beforehand.lock.record import CheckId, Count, Figure, FitId, Name, Record, RulingId


class Descriptive(Record):
    """What one column looks like."""

    column: str = Field(description="Name of the column.")
    kind: str = Field(description="number or category.")
    unit: str | None = Field(description="Its unit.")
    n: Count = Field(description="Values present.")
    missing: Count = Field(description="Values missing.")
    mean: Figure | None = Field(description="Mean.")
    sd: Figure | None = Field(description="Standard deviation, with n - 1.")
    minimum: Figure | None = Field(description="Smallest value.")
    lower_quartile: Figure | None = Field(description="Lower quartile.")
    median: Figure | None = Field(description="Median.")
    upper_quartile: Figure | None = Field(description="Upper quartile.")
    maximum: Figure | None = Field(description="Largest value.")
    skewness: Figure | None = Field(description="Skewness.")
    kurtosis: Figure | None = Field(description="Kurtosis.")
    levels: Mapping[Name, Count] = Field(description="Rows of each level of a category.")


class MissingRecord(Record):
    """What was missing in one predictor."""

    predictor: str = Field(description="Name of the predictor.")
    missing: Count = Field(description="Cells missing among rows with an outcome.")
    share: Figure = Field(description="Their share.")
    rows_left: Count = Field(description="Rows that left for it.")
    standardized_difference: Figure | None = Field(
        description="Difference of the rows that left from those that stayed, in standard deviations."
    )


class FillRecord(Record):
    """Cells that were filled."""

    predictor: str = Field(description="Name of the predictor.")
    method: str = Field(description="How they were filled.")
    value: Figure | str | None = Field(description="The value, where there is one.")
    cells: Count = Field(description="How many.")


class Correlation(Record):
    """Correlation of two predictors at a stage."""

    stage: str = Field(description="Stage of the run.")
    first: str = Field(description="Predictor earlier in the plan.")
    second: str = Field(description="Predictor later in the plan.")
    r: Figure | None = Field(description="Correlation coefficient.")


class Inflation(Record):
    """Variance inflation of a predictor at a stage."""

    stage: str = Field(description="Stage of the run.")
    predictor: str = Field(description="Name of the predictor.")
    vif: Figure | None = Field(description="VIF, or for a block the generalized VIF to the power 1/df.")


class Condition(Record):
    """One condition index with its variance shares (Belsley, Kuh, Welsch 1980)."""

    stage: str = Field(description="Stage of the run.")
    index: Figure | None = Field(description="Condition index.")
    shares: Mapping[Name, Figure] = Field(description="Share of each coefficient's variance.")


class AssumptionCheck(Record):
    """One check of an assumption."""

    id: CheckId = Field(description="Number, in the order of the run.")
    stage: str = Field(description="Stage of the run.")
    check: str = Field(description="Name of the check.")
    subject: str | None = Field(description="Predictor it is about; null for the model.")
    fit: FitId | None = Field(description="Fit that is checked.")
    statistic: Figure | None = Field(description="Its statistic.")
    df: tuple[int, ...] = Field(description="Degrees of freedom, where it has any.")
    p: Figure | None = Field(description="Its p.")
    alpha: Figure | None = Field(description="Level against which p is held.")
    verdict: Literal["passed", "failed", "not_applicable"] = Field(description="What came out.")
    because: str | None = Field(description="Why it could not be made.")


class InfluenceRow(Record):
    """A flagged row: its measures, and the answer with and without it."""

    row: str = Field(description="Label of the row.")
    ruling: RulingId | None = Field(description="Ruling about it.")
    leverage: Figure | None = Field(description="Leverage.")
    studentized_residual: Figure | None = Field(description="Externally studentized residual.")
    cooks_distance: Figure | None = Field(description="Cook's distance.")
    dffits: Figure | None = Field(description="DFFITS.")
    change_r_squared: Figure | None = Field(description="Change of R² without it.")
    change_coefficient: Figure | None = Field(
        description="Largest change of a coefficient without it, in standard errors of the fit with it."
    )
    of: str | None = Field(description="The coefficient that changes most.")
    significance_changes: tuple[str, ...] = Field(description="Predictors whose significance changes.")
    sign_changes: tuple[str, ...] = Field(description="Predictors whose sign changes.")
    stays: bool = Field(description="Whether the row stays.")


class JointComparison(Record):
    """All flagged rows that stayed, left out together."""

    rows: Count = Field(description="How many rows.")
    fit: FitId = Field(description="The fit without them.")
    change_r_squared: Figure | None = Field(description="Change of R² without them.")
    change_coefficient: Figure | None = Field(
        description="Largest change of a coefficient without them, in standard errors of the fit with them."
    )
    of: str | None = Field(description="The coefficient that changes most.")


class Checks(Record):
    """Everything that was looked at beside the fits, by stage."""

    descriptives: tuple[Descriptive, ...] = Field(description="Each column of the plan.")
    missing: tuple[MissingRecord, ...] = Field(description="What was missing.")
    fills: tuple[FillRecord, ...] = Field(description="What was filled.")
    correlations: tuple[Correlation, ...] = Field(description="Correlations of pairs of predictors.")
    inflation: tuple[Inflation, ...] = Field(description="Variance inflation.")
    condition: tuple[Condition, ...] = Field(description="Condition indices.")
    assumptions: tuple[AssumptionCheck, ...] = Field(description="Checks of assumptions.")
    influence: tuple[InfluenceRow, ...] = Field(description="Flagged rows.")
    jointly_without_flagged: JointComparison | None = Field(
        description="Flagged rows that stayed, left out together."
    )
