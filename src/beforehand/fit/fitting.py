"""The classical fit of a swept model: estimates, standard errors, t and F tests, criteria."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from fractions import Fraction

import numpy as np
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
    keys: list[Key | None] = [None, *tableau.keys] if tableau.intercept else list(tableau.keys)
    estimates, errors = _slopes(tableau, exact)
    if tableau.intercept:
        estimates.insert(0, float(tableau.constant))
        errors.insert(0, square_root(s2) * float(tableau.constant_root()))
    coefficients = _tested(keys, estimates, errors, df, exact)
    tests = _tests(tableau, blocks, coefficients[int(tableau.intercept) :], exact)
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


def _slopes(tableau: Tableau, exact: bool) -> tuple[list[float], list[float]]:
    """Coefficients and standard errors without the intercept's, each with one rounding."""
    shifts = [tableau.shifts[-1] - shift for shift in tableau.shifts[:-1]]
    slopes, roots = tableau.grid.solution(max(tableau.df, 1))
    estimates = [_scaled(slope, shift) for slope, shift in zip(slopes, shifts, strict=True)]
    if exact or tableau.df <= 0:
        return estimates, [0.0] * len(estimates)
    return estimates, [_scaled(root, shift) for root, shift in zip(roots, shifts, strict=True)]


def _scaled(value: float, shift: int) -> float:
    """``value * 2**shift``; what falls below the smallest double with all its digits has lost some."""
    found = math.ldexp(value, shift)
    if value and not abs(found) >= SMALLEST_ERROR:
        raise Unrepresentable(_BEYOND)
    return found


def _tested(
    keys: Sequence[Key | None], estimates: Sequence[float], errors: Sequence[float], df: int, exact: bool
) -> list[Coefficient]:
    """Coefficients with t and p, which an exact fit has not."""
    if exact or df <= 0:
        return [
            Coefficient(key=key, estimate=estimate, standard_error=error, t=None, p=None)
            for key, estimate, error in zip(keys, estimates, errors, strict=True)
        ]
    ratios = [
        estimate / error if error else math.nan for estimate, error in zip(estimates, errors, strict=True)
    ]
    tails = 2.0 * stdtr(df, -np.abs(np.array(ratios)))
    return [
        Coefficient(
            key=key, estimate=estimate, standard_error=error,
            t=ratio if error else None, p=p if error else None,
        )
        for key, estimate, error, ratio, p in zip(
            keys, estimates, errors, ratios, tails.tolist(), strict=True
        )
    ]  # fmt: skip


def _tests(
    tableau: Tableau, blocks: Mapping[str, tuple[Key, ...]], slopes: Sequence[Coefficient], exact: bool
) -> dict[str, TermTest]:
    """The test of each predictor: of its t for one column, of its block's F otherwise."""
    own = {coefficient.key: coefficient for coefficient in slopes}
    rss, df = tableau.residual, tableau.df
    found: dict[str, TermTest] = {}
    for name, keys in blocks.items():
        if not keys:
            # A category with one level in these rows has no column, and nothing of it can be tested.
            found[name] = TermTest(predictor=name, df=0, statistic=None, p=None, partial_f2=None)
            continue
        if len(keys) == 1:
            one = own[keys[0]]
            f2 = None if one.t is None or rss == 0 else one.t * one.t / df
            statistic = None if one.t is None else abs(one.t)
            found[name] = TermTest(predictor=name, df=1, statistic=statistic, p=one.p, partial_f2=f2)
            continue
        f2 = None if exact or rss == 0 else tableau.gain(keys) / rss
        f = None if f2 is None else f2 * df / len(keys)
        p = None if f is None else float(fdtrc(len(keys), df, f))
        found[name] = TermTest(predictor=name, df=len(keys), statistic=f, p=p, partial_f2=f2)
    return found
