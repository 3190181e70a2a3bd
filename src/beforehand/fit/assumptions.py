"""Assumption checks on a fit: a straight relation, an even spread, independent residuals.

Each is an auxiliary regression on the exact moments of the fit, extended by the columns that the
check makes itself. What cannot be checked says why.
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray
from scipy.special import chdtrc, fdtrc

from beforehand.fit.columns import FloatArray, Key, Source
from beforehand.fit.dependence import independent_of
from beforehand.fit.descriptives import shape_of
from beforehand.fit.moments import Moments
from beforehand.fit.normality import EXACT_FIT, jarque_bera, shapiro_wilk
from beforehand.fit.overlay import Overlay, made
from beforehand.fit.results import Check
from beforehand.fit.sums import exact_sum
from beforehand.fit.sweeping import RankDeficient
from beforehand.fit.tableau import Tableau, added_column_test, tableau_of

__all__ = [
    "breusch_godfrey",
    "breusch_pagan",
    "curvature",
    "durbin_watson",
    "jarque_bera",
    "reset",
    "shapiro_wilk",
    "white",
]

# White's full form has k (k + 3) / 2 columns; beyond so many it says little and takes long.
MOST_AUXILIARY_COLUMNS = 120

SQUARED_RESIDUAL = made("squared residual")


def curvature(tableau: Tableau, square: Key, moments: Moments) -> Check:
    """Whether a predictor's square adds to the model.

    Parameters
    ----------
    tableau : Tableau
        The model with the predictor.
    square : Key
        The square of the predictor about a centre; the centre does not matter to the test in a
        model with an intercept.
    moments : Moments
        Of the same rows, with the square.

    Returns
    -------
    Check
        t of the added square on the residual degrees of freedom less one.
    """
    if tableau.exact:
        return _not_made("curvature", EXACT_FIT)
    found = added_column_test(tableau, square, moments)
    if found is None:
        return _not_made("curvature", "its square is a combination of the columns in the model")
    t, p, df = found
    return Check(name="curvature", statistic=t, p=p, df=(df,))


def breusch_pagan(source: Source, tableau: Tableau, keys: Sequence[Key], residual: FloatArray) -> Check:
    """Whether squared residuals go with the given columns.

    Parameters
    ----------
    source : Source
        The rows of the fit.
    tableau : Tableau
    keys : sequence of Key
        Columns that the spread may go with, of the table or of the model.
    residual : FloatArray, shape (n,)

    Returns
    -------
    Check
        n R² of the squared residuals on the columns and a constant, chi-square with as many degrees
        of freedom as columns: Koenker's studentized form (1981, J. Econometrics 17:107-112) of the
        test of Breusch & Pagan (1979).
    """
    return _spread("breusch_pagan", source, tableau, tuple(keys), residual)


def white(source: Source, tableau: Tableau, keys: Sequence[Key], residual: FloatArray) -> Check:
    """Whether squared residuals go with the columns, their squares and cross-products.

    Parameters
    ----------
    source : Source
        The rows of the fit; it must supply products of the columns.
    tableau : Tableau
    keys : sequence of Key
        Columns of the model.
    residual : FloatArray, shape (n,)

    Returns
    -------
    Check
        n R² of the auxiliary regression, columns that are combinations of others left out; degrees
        of freedom its rank less one (White 1980, Econometrica 48:817-838).
    """
    pairs = itertools.combinations_with_replacement(tuple(keys), 2)
    wide = (*keys, *(Key(one.factors + other.factors) for one, other in pairs))
    if len(wide) > MOST_AUXILIARY_COLUMNS:
        return _not_made("white", f"it needs {len(wide)} columns, more than {MOST_AUXILIARY_COLUMNS}")
    if len(wide) + 1 >= tableau.n:
        return _not_made("white", f"it needs {len(wide)} columns and there are {tableau.n} rows")
    return _spread("white", source, tableau, wide, residual)


def _spread(
    name: str, source: Source, tableau: Tableau, keys: tuple[Key, ...], residual: FloatArray
) -> Check:
    """Fit squared residuals on columns and a constant: n R²."""
    if tableau.exact:
        return _not_made(name, EXACT_FIT)
    # Scaled to a size of one, so that the squares neither overflow nor vanish.
    scaled = residual / np.abs(residual).max()
    overlay = Overlay(source, {SQUARED_RESIDUAL: scaled * scaled})
    moments = _own(tableau).extended(overlay, (*keys, SQUARED_RESIDUAL))
    if moments.constant(SQUARED_RESIDUAL):
        return _not_made(name, "all squared residuals are equal")
    independent = independent_of(moments, keys, intercept=True)
    if not independent or len(independent) + 1 >= tableau.n:
        return _not_made(name, "its auxiliary regression has no column left")
    fitted = tableau_of(moments, SQUARED_RESIDUAL, independent, intercept=True)
    statistic = float(tableau.n * (1 - fitted.rss / fitted.tss))
    df = len(independent)
    return Check(name=name, statistic=statistic, p=float(chdtrc(df, statistic)), df=(df,))


def reset(source: Source, tableau: Tableau, fitted: FloatArray) -> Check:
    """Whether the square and cube of the fitted values add to the model.

    The fitted values are centred and scaled first: raw powers of values far from 0 are collinear
    and reject correct models.

    Parameters
    ----------
    source : Source
        The rows of the fit.
    tableau : Tableau
    fitted : FloatArray, shape (n,)

    Returns
    -------
    Check
        F of the two added columns (Ramsey 1969, JRSS B 31:350-371, in its F form).
    """
    if tableau.exact:
        return _not_made("reset", EXACT_FIT)
    shape = shape_of(fitted)
    if shape.constant or tableau.n < 2:
        return _not_made("reset", "the fitted values are constant")
    z = (fitted - shape.mean) / shape.sd
    square, cube = made("fitted squared"), made("fitted cubed")
    overlay = Overlay(source, {square: z * z, cube: z * z * z})
    moments = _own(tableau).extended(overlay, (square, cube))
    df = tableau.df - 2
    if df < 1:
        return _not_made("reset", f"it needs {tableau.p + 3} rows and there are {tableau.n}")
    try:
        wide = tableau_of(
            moments, tableau.outcome, (*tableau.keys, square, cube), intercept=tableau.intercept
        )
    except RankDeficient:
        return _not_made("reset", "powers of the fitted values are combinations of the columns in the model")
    if wide.rss == 0:
        return _not_made("reset", "the powers of the fitted values leave no residual")
    f = float(((tableau.rss - wide.rss) / 2) / (wide.rss / df))
    return Check(name="reset", statistic=f, p=float(fdtrc(2, df, f)), df=(2, df))


def durbin_watson(residual: FloatArray, order: NDArray[np.float64], *, exact: bool) -> Check:
    """Squared differences of residuals that follow each other, over their squares.

    Parameters
    ----------
    residual, order : arrays of shape (n,)
        ``order`` ranks the rows; equal ranks keep the canonical order.
    exact : bool
        The fit is exact, so that there is nothing to look at.

    Returns
    -------
    Check
        d of Durbin & Watson (1950, Biometrika 37:409-428); no p, as its distribution hangs on the
        design.
    """
    if exact:
        return _not_made("durbin_watson", EXACT_FIT)
    e = residual[np.argsort(order, kind="stable")]
    step = np.diff(e)
    statistic = exact_sum(step * step) / exact_sum(e * e)
    return Check(name="durbin_watson", statistic=statistic, p=None)


def breusch_godfrey(
    source: Source, tableau: Tableau, residual: FloatArray, order: NDArray[np.float64], lags: int
) -> Check:
    """Whether residuals go with the residuals before them.

    Parameters
    ----------
    source : Source
        The rows of the fit.
    tableau : Tableau
    residual : FloatArray, shape (n,)
    order : array of shape (n,)
        Rank of each row; equal ranks keep the canonical order.
    lags : int
        How many residuals back; those before the first row are taken as 0.

    Returns
    -------
    Check
        n R² of the residuals on the model's columns and their lags, chi-square with ``lags`` degrees
        of freedom (Breusch 1978; Godfrey 1978, Econometrica 46:1293-1301).
    """
    name = "breusch_godfrey"
    if tableau.exact:
        return _not_made(name, EXACT_FIT)
    if tableau.df <= lags:
        return _not_made(name, f"{lags} lags leave no degree of freedom")
    places = np.argsort(order, kind="stable")
    scaled = residual / np.abs(residual).max()
    response = made("residual")
    columns = {response: scaled}
    for lag in range(1, lags + 1):
        lagged = np.zeros(len(scaled))
        lagged[places[lag:]] = scaled[places[:-lag]]
        columns[made(f"residual {lag} before")] = lagged
    moments = _own(tableau).extended(Overlay(source, columns), tuple(columns))
    wide = (*tableau.keys, *(key for key in columns if key != response))
    try:
        fitted = tableau_of(moments, response, wide, intercept=tableau.intercept)
    except RankDeficient:
        return _not_made(name, "the lagged residuals are combinations of the columns in the model")
    statistic = float(tableau.n * max(1 - fitted.rss / fitted.tss, Fraction(0)))
    return Check(name=name, statistic=statistic, p=float(chdtrc(lags, statistic)), df=(lags,))


def _own(tableau: Tableau) -> Moments:
    """Moments of the model's own columns, so that an extension reads no others."""
    return tableau.moments.restricted((*tableau.keys, tableau.outcome))


def _not_made(name: str, reason: str) -> Check:
    return Check(name=name, statistic=None, p=None, not_applicable=reason)
