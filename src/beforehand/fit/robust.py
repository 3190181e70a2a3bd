"""Standard errors that do not lean on equal spread or independence, for the same coefficients."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import fdtrc, stdtr

from beforehand.faults import NumericalError
from beforehand.fit.columns import FloatArray, Key, Source
from beforehand.fit.linear import evaluated, forms_of
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.results import Coefficient, Fit, TermTest
from beforehand.fit.rows import RowValues
from beforehand.fit.sums import sums_by_group
from beforehand.fit.tableau import Tableau

# Rows' pulls are wanted to so many bits below one.
PULL_BITS = 60


class NotEstimable(NumericalError):  # noqa: N818 - named by what is so
    """These standard errors do not exist for this fit."""

    code = "not_estimable"


def robust_fit(
    fit: Fit,
    source: Source,
    tableau: Tableau,
    values: RowValues,
    blocks: Mapping[str, tuple[Key, ...]],
    *,
    errors: str,
    groups: NDArray[np.float64] | None = None,
    order: NDArray[np.float64] | None = None,
    lags: int | None = None,
) -> Fit:
    """The fit with another covariance of its coefficients.

    Parameters
    ----------
    fit : Fit
        The classical one; not an exact one, whose residuals are rounding.
    source, tableau, values
        Rows, swept model and row values of the same fit.
    blocks : mapping of predictor to its columns
        As in the classical fit.
    errors : str
        ``hc0`` (White 1980), ``hc1``, ``hc2``, ``hc3`` (MacKinnon & White 1985, in the form of
        Davidson & MacKinnon 1993), ``cluster`` (Liang & Zeger 1986, with the factor
        G/(G-1) (n-1)/(n-p)) or ``autocorrelation`` (Newey & West 1987, Bartlett weights).
    groups : array of shape (n,), for ``cluster``
        Number of the cluster of each row.
    order : array of shape (n,), for ``autocorrelation``
        Rank of each row.
    lags : int, for ``autocorrelation``

    Returns
    -------
    Fit
        t tests on the residual degrees of freedom, on G - 1 for clusters; Wald F for blocks and the
        model.

    Raises
    ------
    NotEstimable
        For hc2 and hc3 with a row of leverage 1, fewer than two clusters, no order of the rows.
    """
    covariance, df = spread_of(
        _pulls(source, tableau), fit, values, errors=errors, groups=groups, order=order, lags=lags
    )
    roots = _roots(tableau)
    return fit_with(fit, covariance * np.outer(roots, roots), blocks, df, errors)


def spread_of(
    rows: FloatArray,
    fit: Fit,
    values: RowValues,
    *,
    errors: str,
    groups: NDArray[np.float64] | None = None,
    order: NDArray[np.float64] | None = None,
    lags: int | None = None,
) -> tuple[FloatArray, int]:
    """Covariance of linear forms of the coefficients, and the degrees of freedom of its tests.

    Parameters
    ----------
    rows : FloatArray, shape (n, p)
        What each row of the fit, per unit of its residual, does to each of the forms.
    fit, values, errors, groups, order, lags
        As of `robust_fit`.

    Returns
    -------
    tuple of FloatArray, shape (p, p), and int

    Raises
    ------
    NotEstimable
        As of `robust_fit`.
    """
    residual = values.residual
    if errors == "cluster":
        if groups is None:
            raise NotEstimable("no column names the clusters")
        _, codes = np.unique(groups, return_inverse=True)
        count = int(codes.max()) + 1
        if count < 2:
            raise NotEstimable("there is one cluster only")
        scores = np.column_stack(
            [sums_by_group(rows[:, j] * residual, codes.astype(np.intp), count) for j in range(rows.shape[1])]
        )
        return _gram(scores) * (count / (count - 1) * (fit.n - 1) / fit.df_residual), count - 1
    if errors == "autocorrelation":
        if order is None or lags is None:
            raise NotEstimable("no column gives the order of the rows")
        scores = (rows * residual[:, None])[np.argsort(order, kind="stable")]
        return _with_lags(scores, lags), fit.df_residual
    weight, factor = _weights(errors, fit, values)
    return _gram(rows * (residual * weight)[:, None]) * factor, fit.df_residual


def _weights(errors: str, fit: Fit, values: RowValues) -> tuple[FloatArray, float]:
    """What each residual is multiplied by, and the factor of the whole."""
    rest = 1.0 - values.leverage
    if errors in ("hc2", "hc3") and bool((rest <= 0.0).any()):
        raise NotEstimable("a row of leverage 1 leaves no residual to weigh")
    ones = np.ones(len(rest))
    if errors == "hc0":
        return ones, 1.0
    if errors == "hc1":
        return ones, fit.n / fit.df_residual
    return (1.0 / np.sqrt(rest) if errors == "hc2" else 1.0 / rest), 1.0


def _pulls(source: Source, tableau: Tableau) -> FloatArray:
    """``(X'X)⁻¹ x`` of each row over the root of its diagonal, the intercept first: shape (n, p)."""
    weights, constants = tableau.pulls(with_constant=tableau.intercept)
    forms = forms_of(tableau.keys, tableau.tops(tableau.keys), weights, constants, lowest_bit=-PULL_BITS)
    out = np.empty((source.n_rows, tableau.p), order="F")
    for start, stop, block in evaluated(source, forms):
        out[start:stop] = block
    return out


def _roots(tableau: Tableau) -> FloatArray:
    """Roots of the diagonal of the inverse cross-products, the intercept first."""
    slopes = [float(root) for root in tableau.inverse_roots()]
    return np.array([float(tableau.constant_root()), *slopes] if tableau.intercept else slopes)


def _gram(scores: FloatArray) -> FloatArray:
    """Cross-products of columns, without rounding until the last."""
    keys = [named(str(j)) for j in range(scores.shape[1])]
    moments = moments_of(ArraySource({key: scores[:, j] for j, key in enumerate(keys)}), keys)
    return moments.raw(keys, keys)


def _with_lags(scores: FloatArray, lags: int) -> FloatArray:
    """Cross-products with those of rows up to ``lags`` apart, in Bartlett's weights."""
    n, p = scores.shape
    keys = [named(str(j)) for j in range(p)]
    late = [named(f"{j} later") for j in range(p)]
    total = _gram(scores)
    for lag in range(1, min(lags, n - 1) + 1):
        columns = {key: scores[:-lag, j] for j, key in enumerate(keys)}
        columns |= {key: scores[lag:, j] for j, key in enumerate(late)}
        cross = moments_of(ArraySource(columns), [*keys, *late]).raw(keys, late)
        total = total + (1.0 - lag / (lags + 1)) * (cross + cross.T)
    return total


def fit_with(
    fit: Fit, covariance: FloatArray, blocks: Mapping[str, tuple[Key, ...]], df: int, errors: str
) -> Fit:
    """A fit with another covariance of its coefficients and all that follows from it.

    Parameters
    ----------
    fit : Fit
    covariance : FloatArray, shape (p, p)
        In the order of the fit's coefficients.
    blocks : mapping of predictor to its columns
    df : int
        Degrees of freedom of the tests.
    errors : str
        What the covariance is called.
    """
    coefficients = tuple(_coefficient(c, float(covariance[j, j]), df) for j, c in enumerate(fit.coefficients))
    estimates = np.array([c.estimate for c in fit.coefficients])
    place = {c.key: j for j, c in enumerate(fit.coefficients)}
    tests: dict[str, TermTest] = {}
    for name, keys in blocks.items():
        places = [place[key] for key in keys]
        old = fit.tests[name]
        if not places:
            tests[name] = old
        elif len(places) == 1:
            own = coefficients[places[0]]
            statistic = None if own.t is None else abs(own.t)
            tests[name] = replace(old, statistic=statistic, p=own.p)
        else:
            f = _wald(covariance, estimates, places)
            p = None if f is None else float(fdtrc(len(places), df, f))
            tests[name] = replace(old, statistic=f, p=p)
    slopes = [j for j, c in enumerate(fit.coefficients) if c.key is not None]
    f = _wald(covariance, estimates, slopes) if slopes else None
    return replace(
        fit, coefficients=coefficients, tests=tests, errors=errors,
        df_inference=df, f=f, f_df=(len(slopes), df),
        f_p=None if f is None else float(fdtrc(len(slopes), df, f)),
    )  # fmt: skip


def _coefficient(old: Coefficient, variance: float, df: int) -> Coefficient:
    """A coefficient with another variance."""
    error = float(np.sqrt(max(variance, 0.0)))
    if error == 0.0:
        return replace(old, standard_error=0.0, t=None, p=None)
    t = old.estimate / error
    return replace(old, standard_error=error, t=t, p=2.0 * float(stdtr(df, -abs(t))))


# A pivot of a covariance scaled to a unit diagonal below this leaves a Wald test without meaning:
# with fewer clusters than coefficients the covariance is singular.
SINGULAR = 1e-12


def _wald(covariance: FloatArray, estimates: FloatArray, places: list[int]) -> float | None:
    """``b' V⁻¹ b / q`` by elimination in a fixed order; None where V is singular."""
    own = covariance[np.ix_(places, places)]
    scale = np.sqrt(np.diag(own))
    if not bool((scale > 0.0).all()):
        return None
    rest = own / np.outer(scale, scale)
    b = estimates[places] / scale
    total = 0.0
    for k in range(len(places)):
        pivot = float(rest[k, k])
        if pivot < SINGULAR:
            return None
        total += float(b[k]) ** 2 / pivot
        share = rest[k + 1 :, k] / pivot
        b[k + 1 :] -= share * b[k]
        rest[k + 1 :] -= share[:, None] * rest[k]
    return total / len(places)
