"""The classical fit of a swept model: estimates, standard errors, t and F tests, criteria."""

from __future__ import annotations

import math
from collections.abc import Mapping
from fractions import Fraction

from scipy.special import fdtrc, stdtr

from beforehand.faults import NumericalError
from beforehand.fit.columns import Key
from beforehand.fit.results import Coefficient, Fit, TermTest
from beforehand.fit.sweeping import square_root
from beforehand.fit.tableau import Tableau

# A residual sum of squares below this, of an outcome of size 1e-150, has lost digits to underflow.
SMALLEST_RSS = 1e-300

# The smallest double with all its digits.
SMALLEST_ERROR = 2.0**-1022

_BEYOND = "a number of this fit is too large or too small for a double; other units of the columns help"


class Unrepresentable(NumericalError):  # noqa: N818 - named by what is so, as its neighbours are
    """A number of the fit is beyond the doubles."""

    code = "unrepresentable"


def fit_of(tableau: Tableau, blocks: Mapping[str, tuple[Key, ...]]) -> Fit:
    """The classical fit of a swept model, with a test for each block of columns.

    Parameters
    ----------
    tableau : Tableau
    blocks : mapping of predictor to its columns

    Returns
    -------
    Fit
        An exact fit has errors of 0 and no t, p, F, AIC or BIC.

    Raises
    ------
    Unrepresentable
        When a coefficient or a sum of squares is too large or too small for a double.
    """
    try:
        fit = _fit_of(tableau, blocks)
    except OverflowError as error:
        raise Unrepresentable(_BEYOND) from error
    smallest = min((c.standard_error for c in fit.coefficients), default=math.inf)
    if not fit.exact and (fit.rss < SMALLEST_RSS or smallest < SMALLEST_ERROR):
        raise Unrepresentable(_BEYOND)
    return fit


def _fit_of(tableau: Tableau, blocks: Mapping[str, tuple[Key, ...]]) -> Fit:
    """The fit, with Python's own fault for what is too large."""
    n, p, df = tableau.n, tableau.p, tableau.df
    rss, tss = tableau.rss, tableau.tss
    exact = tableau.exact
    s2 = Fraction(0) if exact or df <= 0 else rss / df
    coefficients: list[Coefficient] = []
    if tableau.intercept:
        se = square_root(s2) * float(tableau.constant_root())
        coefficients.append(_coefficient(None, float(tableau.constant), se, df, exact))
    for k, key in enumerate(tableau.keys):
        variance = Fraction(0) if exact else s2 * tableau.inverse_diagonal(k)
        coefficients.append(_coefficient(key, float(tableau.slope(k)), square_root(variance), df, exact))
    tests = {name: _test(name, keys, tableau, coefficients, exact) for name, keys in blocks.items()}
    r2 = float(1 - rss / tss) if tss else 0.0
    if exact:
        # Nothing is explained where nothing varies.
        r2 = 1.0 if tss else 0.0
    model_df = len(tableau.keys)
    f = None if exact or not model_df or rss == 0 else float(((tss - rss) / model_df) / (rss / df))
    total_df = n - int(tableau.intercept)
    deviance = None if exact or float(rss) < SMALLEST_RSS else n * math.log(2 * math.pi * float(rss / n)) + n
    return Fit(
        n=n, p=p, df_residual=df, df_inference=df, coefficients=tuple(coefficients), tests=tests,
        rss=0.0 if exact else float(rss), tss=float(tss), r_squared=r2,
        adjusted_r_squared=r2 if exact else float(1 - (rss / df) / (tss / total_df)),
        residual_sd=square_root(s2), f=f, f_df=(model_df, df),
        f_p=None if f is None else float(fdtrc(model_df, df, f)),
        aic=None if deviance is None else deviance + 2 * p,
        bic=None if deviance is None else deviance + p * math.log(n),
        exact=exact,
    )  # fmt: skip


def _coefficient(key: Key | None, estimate: float, se: float, df: int, exact: bool) -> Coefficient:
    if exact or se == 0.0:
        return Coefficient(key=key, estimate=estimate, standard_error=se, t=None, p=None)
    t = estimate / se
    return Coefficient(key=key, estimate=estimate, standard_error=se, t=t, p=2.0 * float(stdtr(df, -abs(t))))


def _test(
    name: str, keys: tuple[Key, ...], tableau: Tableau, coefficients: list[Coefficient], exact: bool
) -> TermTest:
    if not keys:
        # A category with one level in these rows has no column, and nothing of it can be tested.
        return TermTest(predictor=name, df=0, statistic=None, p=None, partial_f2=None)
    gain, rss = tableau.gain(keys), max(int(tableau.matrix[-1, -1]), 0)
    f2 = None if exact or rss == 0 else float(Fraction(gain, rss))
    if len(keys) == 1:
        own = next(c for c in coefficients if c.key == keys[0])
        return TermTest(
            predictor=name, df=1, statistic=None if own.t is None else abs(own.t), p=own.p, partial_f2=f2
        )
    f = None if f2 is None else f2 * tableau.df / len(keys)
    p = None if f is None else float(fdtrc(len(keys), tableau.df, f))
    return TermTest(predictor=name, df=len(keys), statistic=f, p=p, partial_f2=f2)
