"""Assumption checks in plain doubles: the statistics of `assumptions`, for fits that are not recorded."""

from __future__ import annotations

import itertools
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from scipy.special import chdtrc, fdtrc, stdtr

from beforehand.fit.assumptions import MOST_AUXILIARY_COLUMNS
from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.doubles import Columns, Design, NotQuick, Response, Solved
from beforehand.fit.results import Check

# A column that keeps less of its squared length than this is a combination of the others; between
# this and NEAR a double cannot tell.
NOTHING_LEFT = 1e-20
NEAR = 1e-8


def not_made(name: str, reason: str) -> Check:
    """A check that could not be made, and why."""
    return Check(name=name, statistic=None, p=None, not_applicable=reason)


def curvature(columns: Columns, fit: Solved, square: Key, response: Response) -> Check:
    """T test of an added square."""
    design = fit.design
    place = columns.places((square,))
    across = columns.cross(design.places, place, design.gone)[:, 0]
    own = float(columns.cross(place, place, design.gone)[0, 0])
    left = own - float(across @ design.inverse @ across)
    if own <= 0.0 or left <= NEAR:
        raise NotQuick("the square is nearly a combination of the columns in the model")
    gain = float(response.cross_in(place, design.gone)[0] - across @ fit.slopes)
    df = design.df - 1
    rest = fit.rss - gain * gain / left
    if df < 1 or rest <= NEAR * fit.tss:
        raise NotQuick("the square leaves next to no residual")
    t = gain / np.sqrt(left * rest / df)
    return Check(name="curvature", statistic=float(t), p=float(2.0 * stdtr(df, -abs(t))), df=(df,))


def breusch_pagan(columns: Columns, keys: Sequence[Key], design: Design, residual: FloatArray) -> Check:
    """N R² of the squared residuals on some columns and a constant."""
    own = columns.design(keys, tuple(design.gone.tolist()))
    return _spread("breusch_pagan", columns.about_mean(own), own.inverse, residual)


def _spread(name: str, about: FloatArray, inverse: FloatArray, residual: FloatArray) -> Check:
    """N R² of squared residuals on columns about their means."""
    n, df = about.shape
    scaled = residual / np.abs(residual).max()
    squared = scaled * scaled
    squared = squared - squared.mean()
    total = float(squared @ squared)
    if total <= NEAR * NEAR * n:
        raise NotQuick("all squared residuals are nearly equal")
    if not df or df + 1 >= n:
        return not_made(name, "its auxiliary regression has no column left")
    cross = squared @ about
    statistic = n * float(cross @ inverse @ cross) / total
    return Check(name=name, statistic=statistic, p=float(chdtrc(df, statistic)), df=(df,))


def white(columns: Columns, keys: Sequence[Key], design: Design, residual: FloatArray) -> Check:
    """N R² of the squared residuals on the columns, their squares and products."""
    pairs = itertools.combinations_with_replacement(tuple(keys), 2)
    wide = (*keys, *(Key(one.factors + other.factors) for one, other in pairs))
    if len(wide) > MOST_AUXILIARY_COLUMNS:
        return not_made("white", f"it needs {len(wide)} columns, more than {MOST_AUXILIARY_COLUMNS}")
    if len(wide) + 1 >= design.n:
        return not_made("white", f"it needs {len(wide)} columns and there are {design.n} rows")
    places = columns.places(wide)
    values = columns.values[:, places]
    if len(design.gone):
        values = np.delete(values, design.gone, axis=0)
        values = values - values.mean(axis=0)
    kept = _independent(values)
    return _spread("white", kept, np.eye(kept.shape[1]), residual)


def _independent(values: FloatArray) -> FloatArray:
    """An orthonormal basis of columns about their means, by Gram and Schmidt, each column twice."""
    basis = np.empty((values.shape[0], values.shape[1]), order="F")
    width = 0
    for at in range(values.shape[1]):
        column = values[:, at]
        length = float(column @ column)
        if length <= NOTHING_LEFT:
            continue
        left = column / np.sqrt(length)
        for _ in range(2):
            left = left - basis[:, :width] @ (left @ basis[:, :width])
        rest = float(left @ left)
        if rest <= NOTHING_LEFT:
            continue
        if rest <= NEAR:
            raise NotQuick("columns of the auxiliary regression nearly depend on each other")
        basis[:, width] = left / np.sqrt(rest)
        width += 1
    return basis[:, :width]


def reset(columns: Columns, fit: Solved, residual: FloatArray, fitted: FloatArray) -> Check:
    """F of the square and cube of the fitted values, centred and scaled first."""
    design = fit.design
    spread = float(fitted.std())
    if spread <= NEAR * float(np.abs(residual).max()):
        return not_made("reset", "the fitted values are constant")
    df = design.df - 2
    if df < 1:
        return not_made("reset", f"it needs {design.k + 4} rows and there are {design.n}")
    z = (fitted - fitted.mean()) / spread
    powers = np.column_stack([z * z, z * z * z])
    powers -= powers.mean(axis=0)
    lengths = np.einsum("ij,ij->j", powers, powers)
    about = columns.about_mean(design)
    for _ in range(2):
        powers -= about @ (design.inverse @ (about.T @ powers))
    left = powers.T @ powers
    second = left[1, 1] - left[0, 1] * left[0, 1] / left[0, 0] if left[0, 0] > 0.0 else 0.0
    shares = np.array([left[0, 0], second]) / np.where(lengths > 0.0, lengths, 1.0)
    if (shares <= NOTHING_LEFT * 1e4).any():
        return not_made("reset", "powers of the fitted values are combinations of the columns in the model")
    if (shares <= NEAR).any():
        raise NotQuick("powers of the fitted values are nearly combinations of the columns")
    cross = residual @ powers
    gain = float(cross @ np.linalg.solve(left, cross))
    rest = fit.rss - gain
    if rest <= NEAR * fit.tss:
        raise NotQuick("the powers of the fitted values leave next to no residual")
    f = (gain / 2) / (rest / df)
    return Check(name="reset", statistic=f, p=float(fdtrc(2, df, f)), df=(2, df))


def jarque_bera(residual: FloatArray) -> Check:
    """Skewness and kurtosis of the residuals."""
    about = residual - residual.mean()
    squared = about * about
    variance = float(squared.mean())
    skewness = float((squared * about).mean()) / variance**1.5
    kurtosis = float((squared * squared).mean()) / variance**2
    statistic = len(residual) / 6.0 * (skewness**2 + (kurtosis - 3.0) ** 2 / 4.0)
    return Check(name="jarque_bera", statistic=statistic, p=float(chdtrc(2.0, statistic)), df=(2,))


def durbin_watson(residual: FloatArray, order: NDArray[np.float64]) -> Check:
    """Squared differences of residuals that follow each other, over their squares."""
    e = residual[np.argsort(order, kind="stable")]
    step = np.diff(e)
    return Check(name="durbin_watson", statistic=float(step @ step) / float(e @ e), p=None)


def breusch_godfrey(
    columns: Columns, design: Design, residual: FloatArray, order: NDArray[np.float64], lags: int
) -> Check:
    """N R² of the residuals on the columns and the residuals before them."""
    name = "breusch_godfrey"
    if design.df <= lags:
        return not_made(name, f"{lags} lags leave no degree of freedom")
    places = np.argsort(order, kind="stable")
    scaled = residual / np.abs(residual).max()
    lagged = np.zeros((len(scaled), lags))
    for lag in range(1, lags + 1):
        lagged[places[lag:], lag - 1] = scaled[places[:-lag]]
    lagged -= lagged.mean(axis=0)
    lengths = np.einsum("ij,ij->j", lagged, lagged)
    about = columns.about_mean(design)
    lagged -= about @ (design.inverse @ (about.T @ lagged))
    left = lagged.T @ lagged
    pivots = np.linalg.eigvalsh(left)
    if pivots.min() <= NEAR * lengths.max():
        raise NotQuick("the lagged residuals are nearly combinations of the columns in the model")
    cross = scaled @ lagged
    statistic = len(scaled) * float(cross @ np.linalg.solve(left, cross)) / float(scaled @ scaled)
    return Check(name=name, statistic=statistic, p=float(chdtrc(lags, statistic)), df=(lags,))
