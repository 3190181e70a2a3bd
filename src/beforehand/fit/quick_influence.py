"""Influence of single rows in plain doubles: the closed forms of `influence`, for work not recorded."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np
from scipy.special import fdtrc, stdtr

from beforehand.fit.columns import FloatArray
from beforehand.fit.doubles import SMALLEST_REST, Columns, NotQuick, Solved
from beforehand.fit.influence import NOTHING_LEFT, Influence, WithoutEach, measures_of

if TYPE_CHECKING:
    from numpy.typing import NDArray

# A leverage nearer to 1 than this belongs to a row that alone makes a coefficient.
SOLE = 1e-9

# Between that and this a double cannot tell.
NEARLY_SOLE = 1e-6


def leverage_of(columns: Columns, fit: Solved) -> FloatArray:
    """Leverages of the rows in use, 1 for a row that alone makes a coefficient."""
    leverage = columns.leverage(fit.design)
    rest = 1.0 - leverage
    if bool(((rest > SOLE) & (rest < NEARLY_SOLE)).any()):
        raise NotQuick("a leverage is too near to 1")
    return np.where(rest <= SOLE, 1.0, leverage)


def influence(columns: Columns, fit: Solved, residual: FloatArray, *, dfbetas: bool) -> Influence:
    """Influence measures of every row in use."""
    design = fit.design
    leverage = leverage_of(columns, fit)
    found = measures_of(leverage, residual, rss=fit.rss, p=design.k + 1, df=design.df)
    if not dfbetas:
        return found.influence(None)
    scaled = np.abs(columns.pulls(design)) / np.sqrt(design.inverse.diagonal())
    with np.errstate(divide="ignore", invalid="ignore"):
        scale = np.abs(residual) / (1.0 - leverage) / np.sqrt(found.without)
    return found.influence(scaled.max(axis=1, initial=0.0) * scale)


def without_each(
    columns: Columns,
    fit: Solved,
    rows: NDArray[np.int64],
    *,
    residual: FloatArray,
    about: FloatArray,
    blocks: Mapping[str, tuple[int, ...]],
) -> WithoutEach:
    """The fit without each of some rows alone.

    Parameters
    ----------
    columns : Columns
    fit : Solved
    rows : array of int, shape (m,)
        Places among the rows in use, none of leverage 1.
    residual, about : FloatArray, shape (m,)
        Residual of these rows, and their outcome about its mean.
    blocks : mapping of predictor to places in the design
        Predictors whose p without each row is wanted.
    """
    design = fit.design
    pulls = columns.pulls(design)[rows]
    rest = 1.0 - columns.leverage(design)[rows]
    root = np.sqrt(design.inverse.diagonal())
    shift = pulls * (residual / rest)[:, None]
    in_errors = np.abs(shift) / (root * np.sqrt(fit.s2))
    column = in_errors.argmax(axis=1)
    lost = residual * residual / rest
    if bool((fit.rss - lost <= SMALLEST_REST * fit.rss).any()):
        raise NotQuick("without one row next to nothing is left to explain")
    n = design.n
    total = fit.tss - about * about * (n / (n - 1))
    with np.errstate(divide="ignore", invalid="ignore"):
        change = np.where(total > NOTHING_LEFT * fit.tss, fit.rss / fit.tss - (fit.rss - lost) / total, 0.0)
    estimates = fit.slopes - shift
    s2 = np.maximum((fit.rss - lost) / (design.df - 1), 0.0)
    return WithoutEach(
        change_r_squared=change,
        change_coefficient=in_errors[np.arange(len(rows)), column],
        column=column,
        p={
            name: _p_without(design.inverse, places, pulls, rest, estimates, s2, design.df - 1)
            for name, places in blocks.items()
        },
        estimates=estimates,
    )


def _p_without(
    inverse: FloatArray,
    places: tuple[int, ...],
    pulls: FloatArray,
    rest: FloatArray,
    estimates: FloatArray,
    s2: FloatArray,
    df: int,
) -> FloatArray:
    """The p of one predictor without each row."""
    with np.errstate(divide="ignore", invalid="ignore"):
        if len(places) == 1:
            at = places[0]
            variance = inverse[at, at] + pulls[:, at] * pulls[:, at] / rest
            t = estimates[:, at] / np.sqrt(s2 * variance)
            return np.asarray(2.0 * stdtr(df, -np.abs(t)))
        block = pulls[:, places]
        own = inverse[np.ix_(places, places)] + block[:, :, None] * block[:, None, :] / rest[:, None, None]
        scaled = estimates[:, places]
        solved = np.linalg.solve(own, scaled[:, :, None])[:, :, 0]
        gain = np.einsum("ij,ij->i", scaled, solved)
        return np.asarray(fdtrc(len(places), df, gain / len(places) / s2))
