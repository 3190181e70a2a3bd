"""What a prediction for a new case needs of a run, so that the lock alone suffices.

Everything is written about centres near the means of the design columns: there neither rounding to
ten digits nor a large mean costs a prediction anything.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import ClassVar

from pydantic import Field

from beforehand.lock.record import Count, Figure, Name, Record

# Residuals beyond so many stand as means of as many groups of neighbours.
MOST_RESIDUALS = 201


def residual_groups(rows: int) -> tuple[int, ...]:
    """Where the groups of ascending residuals end that stand for a fit's rows.

    Each row is a group of its own up to `MOST_RESIDUALS`; beyond, groups are small in the tails, where
    a curved way back to the outcome's scale bends most, and large in the middle: a share s of the groups
    holds the share s² (3 - 2 s) of the rows. In whole numbers, so that it is the same everywhere.
    """
    if rows <= MOST_RESIDUALS:
        return tuple(range(1, rows + 1))
    most = MOST_RESIDUALS
    ends = (rows * k * k * (3 * most - 2 * k) // most**3 for k in range(1, most + 1))
    return tuple(sorted({end for end in ends if end}))


class PredictionFactor(Record):
    """A column of the table as it enters a column of the design."""

    left_out: ClassVar[frozenset[str]] = frozenset({"rung", "exponent", "level"})

    column: str = Field(description="Column of the table.")
    rung: str | None = Field(default=None, description="Rung of the ladder, where it stands under one.")
    exponent: Figure | None = Field(default=None, description="Learned exponent of a Box-Cox power.")
    level: str | None = Field(default=None, description="Level of a category whose indicator this is.")


class PredictionColumn(Record):
    """One column of the final model's design: a product of factors."""

    left_out: ClassVar[frozenset[str]] = frozenset({"spread"})

    term: str = Field(description="Name of the term, as in the answer.")
    factors: tuple[PredictionFactor, ...] = Field(description="What is multiplied.")
    coefficient: Figure = Field(description="Estimate, in units of the fitted outcome per unit of the term.")
    centre: Figure = Field(description="The column's mean over the rows in use; 0 without an intercept.")
    inverse_root: tuple[Figure, ...] = Field(
        description="Row of the lower triangle L with L L' the inverse of the cross-products about the means."
    )
    offset: Figure = Field(
        description="What this column's form L'(x - centre) lacks because the centre is a rounded mean."
    )
    spread: tuple[Figure, ...] | None = Field(
        default=None,
        description="Row of the lower triangle of the covariance of the orthonormal design's coefficients, "
        "the level's first; where errors are not classical.",
    )


class Seen(Record):
    """The values of one predictor in the rows of the fit."""

    left_out: ClassVar[frozenset[str]] = frozenset({"low", "high", "levels"})

    low: Figure | None = Field(default=None, description="Smallest value of a number.")
    high: Figure | None = Field(default=None, description="Largest value of a number.")
    levels: tuple[str, ...] | None = Field(
        default=None, description="Levels of a category that occur, the baseline first."
    )


class SeenTogether(Record):
    """Which levels of two categories that are multiplied occur together in the rows of the fit."""

    first: str = Field(description="The first category of the product.")
    second: str = Field(description="The second one.")
    pairs: tuple[tuple[str, str], ...] = Field(description="Levels that occur together.")


class Prediction(Record):
    """What the answer says of a case that it has not seen."""

    in_blocks: ClassVar[bool] = True
    left_out: ClassVar[frozenset[str]] = frozenset({"level_spread", "together", "residuals"})

    level: Figure = Field(description="Level of the intervals: 1 - alpha.")
    rows: Count = Field(description="Rows of the fit.")
    df: Count = Field(description="Degrees of freedom of the intervals.")
    residual_variance: Figure = Field(description="Variance of the residuals, on the fitted scale.")
    intercept: bool = Field(description="Whether the model has an intercept.")
    at_centres: Figure = Field(description="Fitted value where every column is at its centre.")
    level_spread: Figure | None = Field(
        default=None, description="The level's own entry of the columns' spread."
    )
    largest_leverage: Figure = Field(description="The largest leverage of a row of the fit.")
    columns: tuple[PredictionColumn, ...] = Field(description="Columns of the design, in order.")
    seen: Mapping[Name, Seen] = Field(description="Values of each predictor in the rows of the fit.")
    together: tuple[SeenTogether, ...] | None = Field(
        default=None, description="Levels that occur together, for products of two categories."
    )
    residuals: tuple[Figure, ...] | None = Field(
        default=None,
        description="Residuals on the fitted scale, ascending, for an outcome under a transform; beyond "
        f"{MOST_RESIDUALS} rows the means of at most {MOST_RESIDUALS} groups of neighbours, small in tails.",
    )
