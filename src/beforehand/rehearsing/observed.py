"""The real run beside which a rehearsal is read, where there has been one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from beforehand.rehearsing.trials import Flags, FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class SeenRuling:
    """A ruling of the real run that a replicate may make again: what it says of whom on which ground."""

    id: str
    step: str
    subject: str
    ground: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Observed:
    """What the plan came to on the table as it is; k predictors, c design columns.

    Attributes
    ----------
    lock : str
        Digest of the lock that holds it.
    status : str
    adopted, transformed : array of bool, shape (k,)
        As in `Trials`.
    estimates, errors : FloatArray, shape (c,)
        Of columns that stand in the final model as they were read; NaN for the others.
    full_estimates, full_errors : FloatArray, shape (c,)
        The same in the full model, with which selection began.
    r_squared, adjusted_r_squared : float
    apparent : float
        R² of the answer's predictions over all rows of the base, in units of the outcome: what that of a
        replicate is compared with.
    model_p : float
        NaN where the answer is the mean.
    rulings : tuple of SeenRuling
        Those about predictors and the model, as far as the selection step; rows have rulings of their
        own that another sample could not make.
    """

    lock: str
    status: str
    adopted: Flags
    transformed: Flags
    estimates: FloatArray
    errors: FloatArray
    full_estimates: FloatArray
    full_errors: FloatArray
    r_squared: float
    adjusted_r_squared: float
    apparent: float
    model_p: float
    rulings: tuple[SeenRuling, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class HeldOut:
    """Errors of prediction on rows that the plan had not seen; q repeats of f folds.

    Attributes
    ----------
    folds : int
    groups : tuple of str
        The groups that were left out one at a time; empty where the folds are drawn.
    squared, squared_mean_model : FloatArray, shape (q, f)
        Sums of squared errors of the plan's answer and of the mean of the other rows, in squared units
        of the outcome, over rows that could be predicted.
    rows, not_predicted : array of int64, shape (q, f)
        Rows that were predicted; rows that were not, as a level had not been seen or a rung does not
        apply.
    no_fit : array of bool, shape (q, f)
        Folds on whose other rows no run could be made.
    """

    folds: int
    groups: tuple[str, ...]
    squared: FloatArray
    squared_mean_model: FloatArray
    rows: NDArray[np.int64]
    not_predicted: NDArray[np.int64]
    no_fit: Flags
