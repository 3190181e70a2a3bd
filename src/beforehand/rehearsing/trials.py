"""What a plan came to in many replicates: arrays of one entry for each, ready to be summarized."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
Flags = NDArray[np.bool_]

# ``no_fit`` is a replicate on which no run could be made: too few rows, an outcome of one value.
STATUSES = ("adopted", "mean_only", "inconclusive", "stopped", "no_fit")


@dataclass(frozen=True, slots=True, kw_only=True)
class Subjects:
    """What a rehearsal keeps count of.

    Attributes
    ----------
    names : tuple of str, length k
        Predictors and products, in plan order.
    held : tuple of bool, length k
        Whether a keep rule holds the predictor always; such a one is not found, it was put there.
    columns : tuple of str, length c
        Design columns as they are named in a record, without the intercept.
    owners : tuple of int, length c
        Place in ``names`` of the predictor whose column it is.
    """

    names: tuple[str, ...]
    held: tuple[bool, ...]
    columns: tuple[str, ...]
    owners: tuple[int, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Trials:
    """What a plan came to in B replicates, with k predictors and c design columns.

    Attributes
    ----------
    status : array of int8, shape (B,)
        Places in ``STATUSES``.
    present : array of bool, shape (B, k)
        In the final model of an answer that was adopted.
    adopted : array of bool, shape (B, k)
        Of those, the ones that the plan chose: that are significant there, or that a criterion kept and
        no keep rule had to. A predictor that stands because it may not leave was not found.
    significant : array of bool, shape (B, k)
        In the final model of an answer that was adopted, and significant at the plan's alpha.
    transformed : array of bool, shape (B, k)
        In that model under a rung of the ladder.
    estimates, errors : FloatArray, shape (B, c)
        Coefficients and standard errors of columns that stand in that model as they were read; NaN
        for all others.
    intercept : FloatArray, shape (B,)
        NaN where there is none.
    df : FloatArray, shape (B,)
        Degrees of freedom of the intervals of an adopted answer; NaN for any other.
    r_squared, adjusted_r_squared, model_p : FloatArray, shape (B,)
        Of an adopted answer; 0, 0 and NaN where the mean stands instead, NaN without a fit.
    full_p : FloatArray, shape (B,)
        p of the F test of the model with which selection began.
    rows : array of int64, shape (B,)
        Rows of the final fit.
    here, elsewhere, slope : FloatArray, shape (B,)
        R² of the answer's predictions, in units of the outcome, on the rows of the replicate and on the
        rows that it was drawn from, and the slope of the outcome there on its predictions; NaN where the
        scenario does not ask for them.
    same_rulings : array of bool, shape (B, m)
        Whether each of the m rulings of the real run fell in the replicate as it fell there.
    squared, squared_mean_model : FloatArray, shape (B,)
        Sums of squared errors on rows that were held out, of the answer and of the mean of the others.
    predicted, not_predicted : array of int64, shape (B,)
        Rows that were held out and could be predicted, and those that could not.
    """

    status: NDArray[np.int8]
    present: Flags
    adopted: Flags
    significant: Flags
    transformed: Flags
    estimates: FloatArray
    errors: FloatArray
    intercept: FloatArray
    df: FloatArray
    r_squared: FloatArray
    adjusted_r_squared: FloatArray
    model_p: FloatArray
    full_p: FloatArray
    rows: NDArray[np.int64]
    here: FloatArray
    elsewhere: FloatArray
    slope: FloatArray
    same_rulings: Flags
    squared: FloatArray
    squared_mean_model: FloatArray
    predicted: NDArray[np.int64]
    not_predicted: NDArray[np.int64]

    @property
    def count(self) -> int:
        """How many replicates."""
        return len(self.status)


def joined(parts: Sequence[Trials]) -> Trials:
    """Several blocks of replicates as one, in the order given."""
    return Trials(
        **{f.name: np.concatenate([getattr(part, f.name) for part in parts]) for f in fields(Trials)}
    )


def put(trials: Trials, places: NDArray[np.intp], part: Trials) -> None:
    """Put replicates that were run apart in their places."""
    for f in fields(Trials):
        getattr(trials, f.name)[places] = getattr(part, f.name)


def empty(count: int, subjects: Subjects, rulings: int = 0) -> Trials:
    """Arrays for so many replicates, none of which has come to anything yet."""
    k, c = len(subjects.names), len(subjects.columns)

    def nothing(*shape: int) -> FloatArray:
        return np.full(shape, np.nan)

    def none(*shape: int) -> Flags:
        return np.zeros(shape, dtype=bool)

    return Trials(
        status=np.full(count, STATUSES.index("no_fit"), dtype=np.int8),
        present=none(count, k), adopted=none(count, k),
        significant=none(count, k), transformed=none(count, k),
        estimates=nothing(count, c), errors=nothing(count, c), intercept=nothing(count),
        df=nothing(count), r_squared=nothing(count), adjusted_r_squared=nothing(count),
        model_p=nothing(count), full_p=nothing(count), rows=np.zeros(count, dtype=np.int64),
        here=nothing(count), elsewhere=nothing(count), slope=nothing(count),
        same_rulings=none(count, rulings),
        squared=nothing(count), squared_mean_model=nothing(count),
        predicted=np.zeros(count, dtype=np.int64), not_predicted=np.zeros(count, dtype=np.int64),
    )  # fmt: skip
