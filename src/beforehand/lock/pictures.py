"""What pictures of a run are drawn from: counts on small grids, so that no row stands in them.

Every part has a bounded size, whatever the number of rows; a small table still looks like points.
"""

from __future__ import annotations

from typing import ClassVar

from pydantic import Field

from beforehand.lock.record import Count, Figure, Record

# The finest grid of a cloud, and the longest of its lines.
CLOUD_COLUMNS, CLOUD_ROWS, LINE_POINTS = 48, 32, 24

# Most bins of a histogram, and most quantiles of the residuals.
MOST_BINS, MOST_QUANTILES = 20, 61

Cell = tuple[Count, Count, Count]
Point = tuple[Figure, Figure]


class Histogram(Record):
    """Values of one numeric column, counted in bins of one width."""

    column: str = Field(description="Name of the column.")
    low: Figure = Field(description="Lower edge of the first bin.")
    high: Figure = Field(description="Upper edge of the last bin.")
    counts: tuple[Count, ...] = Field(description="Values in each bin, from the lowest.")


class Cloud(Record):
    """Points of a plane, counted in the cells of a grid."""

    x_low: Figure = Field(description="Left edge of the grid.")
    x_high: Figure = Field(description="Right edge.")
    y_low: Figure = Field(description="Lower edge.")
    y_high: Figure = Field(description="Upper edge.")
    columns: Count = Field(description="Cells from left to right.")
    rows: Count = Field(description="Cells from bottom to top.")
    cells: tuple[Cell, ...] = Field(description="Column, row and points of every cell that is not empty.")


class Straight(Record):
    """Whether the relation of one number with the outcome is straight, the others held."""

    predictor: str = Field(description="Name of the predictor.")
    transform: str = Field(description="Rung of the ladder under which it stands; identity for none.")
    exponent: Figure | None = Field(description="Learned exponent of a Box-Cox power.")
    at_low: Figure = Field(description="Height of the model's line at the left edge.")
    at_high: Figure = Field(description="Its height at the right edge.")
    cloud: Cloud = Field(description="The predictor against its part of the fitted value plus residual.")
    line: tuple[Point, ...] = Field(description="Means of both in groups along the predictor.")


class SpreadAlong(Record):
    """Whether the residuals spread evenly along the fitted values."""

    cloud: Cloud = Field(description="Fitted value against studentized residual.")
    line: tuple[Point, ...] = Field(description="Means of both in groups along the fitted values.")
    width: tuple[Point, ...] = Field(description="Root mean square of the residuals in the same groups.")


class WithOutcome(Record):
    """Correlation of a number with the outcome, both as read."""

    predictor: str = Field(description="Name of the predictor.")
    r: Figure = Field(description="Correlation coefficient, over the rows in use.")


class PictureData(Record):
    """What pictures are drawn from beside the answer, the rulings and the checks."""

    in_blocks: ClassVar[bool] = True

    histograms: tuple[Histogram, ...] = Field(description="Numbers of the plan, among the eligible rows.")
    with_outcome: tuple[WithOutcome, ...] = Field(description="Numbers of the plan with the outcome.")
    straight: tuple[Straight, ...] = Field(description="Numbers in the final model, in plan order.")
    spread: SpreadAlong | None = Field(description="Spread of the final model's residuals.")
    normal: tuple[Figure, ...] = Field(
        description="Quantiles of its residuals, at (i - 1/2) of their number, from the lowest."
    )
    pull: Cloud | None = Field(description="Leverage against studentized residual in the final model.")
