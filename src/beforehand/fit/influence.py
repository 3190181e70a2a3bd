"""Influence of single rows, and the fit without each, in closed form from one fit.

Formulas as in Belsley, Kuh & Welsch (1980), Regression Diagnostics, ch. 2, and Cook (1977).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import fdtrc, stdtr

from beforehand.fit.columns import FloatArray, Key, Source
from beforehand.fit.linear import evaluated, forms_of
from beforehand.fit.rows import RowValues
from beforehand.fit.tableau import Tableau

# Changes of coefficients are wanted to so many bits below one of their standard errors.
CHANGE_BITS = 56


# A row that alone is all but this share of the outcome's variation leaves nothing to explain: without
# it R² is taken as it was.
NOTHING_LEFT = 1e-9


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Influence:
    """Influence measures of every row; each array has shape (n,).

    Attributes
    ----------
    leverage : diagonal of the hat matrix
    internal, external : studentized residuals, by the error of all rows and without the row
    cooks_distance : Cook (1977), eq. 5
    dffits : change of the row's own fitted value, in standard errors without the row
    largest_dfbetas : largest change of a coefficient in standard errors without the row; None
        where not asked for
    covariance_ratio : determinant of the coefficients' covariance without the row over with it
    sole : rows of leverage 1, without which a coefficient cannot be estimated; their other measures
        are NaN, as they do not exist
    """

    leverage: FloatArray
    internal: FloatArray
    external: FloatArray
    cooks_distance: FloatArray
    dffits: FloatArray
    largest_dfbetas: FloatArray | None
    covariance_ratio: FloatArray
    sole: NDArray[np.bool_]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class WithoutEach:
    """The fit without each of some rows alone; m rows, k columns, b predictors.

    Attributes
    ----------
    change_r_squared : FloatArray, shape (m,)
        R² without the row less R² with it.
    change_coefficient : FloatArray, shape (m,)
        Largest absolute change of a coefficient but the intercept, in standard errors of the fit
        with the row.
    column : array of int, shape (m,)
        Column of that coefficient; -1 for a model without any.
    p : mapping of predictor to FloatArray, shape (m,)
        p of each predictor without the row.
    estimates : FloatArray, shape (m, k)
        Coefficients without the row.
    """

    change_r_squared: FloatArray
    change_coefficient: FloatArray
    column: NDArray[np.int64]
    p: Mapping[str, FloatArray]
    estimates: FloatArray


def influence(source: Source, tableau: Tableau, values: RowValues, *, dfbetas: bool = False) -> Influence:
    """Influence measures of every row.

    Parameters
    ----------
    source : Source
        The rows of the fit.
    tableau : Tableau
        Not an exact fit.
    values : RowValues
    dfbetas : bool
        Whether to compute DFBETAS, the one measure that needs every coefficient of every row.

    Returns
    -------
    Influence
        With one residual degree of freedom the measures that leave the row out are NaN.
    """
    found = measures_of(values.leverage, values.residual, rss=float(tableau.rss), p=tableau.p, df=tableau.df)
    return found.influence(_largest_dfbetas(source, tableau, values, found.without) if dfbetas else None)


@dataclass(frozen=True, slots=True, eq=False)
class ClosedForm:
    """Measures that follow from a row's leverage and residual.

    ``without`` is the residual mean square of the fit without the row.
    """

    leverage: FloatArray
    internal: FloatArray
    external: FloatArray
    cooks_distance: FloatArray
    dffits: FloatArray
    covariance_ratio: FloatArray
    sole: NDArray[np.bool_]
    without: FloatArray

    def influence(self, largest_dfbetas: FloatArray | None) -> Influence:
        """All measures."""
        return Influence(
            leverage=self.leverage, internal=self.internal, external=self.external,
            cooks_distance=self.cooks_distance, dffits=self.dffits, largest_dfbetas=largest_dfbetas,
            covariance_ratio=self.covariance_ratio, sole=self.sole,
        )  # fmt: skip


def measures_of(h: FloatArray, e: FloatArray, *, rss: float, p: int, df: int) -> ClosedForm:
    """Measures of rows of leverage ``h`` and residual ``e``, each of shape (n,).

    Parameters
    ----------
    h, e : FloatArray, shape (n,)
    rss : float
        Residual sum of squares of the fit.
    p, df : int
        Coefficients, and residual degrees of freedom.
    """
    sole = h >= 1.0
    s2 = rss / df
    with np.errstate(divide="ignore", invalid="ignore"):
        rest = np.where(sole, np.nan, 1.0 - h)
        internal = e / np.sqrt(s2 * rest)
        without = (df * s2 - e * e / rest) / (df - 1) if df > 1 else np.full(len(h), np.nan)
        without = np.where(without > 0.0, without, np.nan)
        external = e / np.sqrt(without * rest)
        cooks = internal * internal * h / (p * rest)
        dffits = external * np.sqrt(h / rest)
        ratio = (without / s2) ** p / rest
    return ClosedForm(
        leverage=h, internal=internal, external=external, cooks_distance=cooks, dffits=dffits,
        covariance_ratio=ratio, sole=sole, without=without,
    )  # fmt: skip


def _pulls(source: Source, tableau: Tableau) -> FloatArray:
    """``(X'X)⁻¹ x`` of each row, over the root of its diagonal: shape (n_rows, k), slopes only."""
    weights, constants = tableau.pulls()
    forms = forms_of(tableau.keys, tableau.tops(tableau.keys), weights, constants, lowest_bit=-CHANGE_BITS)
    out = np.empty((source.n_rows, len(tableau.keys)))
    for start, stop, block in evaluated(source, forms):
        out[start:stop] = block
    return out


def _largest_dfbetas(source: Source, tableau: Tableau, values: RowValues, without: FloatArray) -> FloatArray:
    """Largest |DFBETAS| of each row over the slopes; in blocks, so that no (n, k) array is made."""
    weights, constants = tableau.pulls()
    forms = forms_of(tableau.keys, tableau.tops(tableau.keys), weights, constants, lowest_bit=-CHANGE_BITS)
    out = np.zeros(source.n_rows)
    for start, stop, block in evaluated(source, forms):
        with np.errstate(divide="ignore", invalid="ignore"):
            scale = np.abs(values.residual[start:stop]) / (1.0 - values.leverage[start:stop])
            out[start:stop] = np.abs(block).max(axis=1, initial=0.0) * scale / np.sqrt(without[start:stop])
    return out


def without_each(
    chosen: Source,
    tableau: Tableau,
    *,
    residual: FloatArray,
    leverage: FloatArray,
    outcome: FloatArray,
    blocks: Mapping[str, tuple[Key, ...]],
) -> WithoutEach:
    """The fit without each of some rows, each left out alone.

    Parameters
    ----------
    chosen : Source
        The m rows in question only, none of leverage 1.
    tableau : Tableau
        Fit of all rows.
    residual, leverage, outcome : FloatArray, shape (m,)
        Of the same rows.
    blocks : mapping of predictor to its columns

    Returns
    -------
    WithoutEach
    """
    k, df = len(tableau.keys), tableau.df
    rest = 1.0 - leverage
    s2 = float(tableau.rss) / df
    s2_without = np.maximum((df * s2 - residual * residual / rest) / (df - 1), 0.0)
    pulls = _pulls(chosen, tableau)
    root = np.array([float(value) for value in tableau.inverse_roots()])
    # Leaving a row out moves the coefficients by (X'X)⁻¹ x e / (1 - h).
    shift = pulls * (residual / rest)[:, None]
    in_errors = np.abs(shift) / np.sqrt(s2)
    estimates = np.array(tableau.estimates)[None, :] - shift * root[None, :]
    column = in_errors.argmax(axis=1) if k else np.full(len(rest), -1)
    largest = in_errors[np.arange(len(rest)), column] if k else np.zeros(len(rest))
    return WithoutEach(
        change_r_squared=_change_of_r_squared(tableau, residual, rest, outcome),
        change_coefficient=largest,
        column=np.asarray(column, dtype=np.int64),
        p={
            name: _p_without(tableau, keys, pulls, root, rest, estimates, s2_without)
            for name, keys in blocks.items()
        },
        estimates=estimates,
    )


def _change_of_r_squared(
    tableau: Tableau, residual: FloatArray, rest: FloatArray, outcome: FloatArray
) -> FloatArray:
    """R² without each row less R² with it."""
    rss, tss, n = float(tableau.rss), float(tableau.tss), tableau.n
    if tableau.intercept:
        about = outcome - float(tableau.outcome_mean)
        tss_without = tss - about * about * (n / (n - 1))
    else:
        tss_without = tss - outcome * outcome
    lost = residual * residual / rest
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where(tss_without > NOTHING_LEFT * tss, rss / tss - (rss - lost) / tss_without, 0.0)


def _p_without(
    tableau: Tableau,
    keys: tuple[Key, ...],
    pulls: FloatArray,
    root: FloatArray,
    rest: FloatArray,
    estimates: FloatArray,
    s2: FloatArray,
) -> FloatArray:
    """The p of one predictor without each row: t for one column, partial F for a block."""
    places = [tableau.keys.index(key) for key in keys]
    df = tableau.df - 1
    with np.errstate(divide="ignore", invalid="ignore"):
        if len(places) == 1:
            at = places[0]
            variance = root[at] * root[at] * (1.0 + pulls[:, at] * pulls[:, at] / rest)
            t = estimates[:, at] / np.sqrt(s2 * variance)
            return np.asarray(2.0 * stdtr(df, -np.abs(t)))
        block = pulls[:, places]
        unit = tableau.unit_inverse_of(places)
        inverse = unit[None, :, :] + block[:, :, None] * block[:, None, :] / rest[:, None, None]
        scaled = estimates[:, places] / root[places]
        gain = _quadratic(inverse, scaled)
        return np.asarray(fdtrc(len(places), df, gain / len(places) / s2))


def _quadratic(matrices: FloatArray, vectors: FloatArray) -> FloatArray:
    """``v' M⁻¹ v`` of each row; shapes (m, q, q) and (m, q), M positive definite.

    By elimination in a fixed order, as a library's solver differs in the last digits by machine.
    """
    rest, left = matrices.copy(), vectors.copy()
    total = np.zeros(len(vectors))
    for k in range(vectors.shape[1]):
        pivot = rest[:, k, k].copy()
        total += left[:, k] * left[:, k] / pivot
        share = rest[:, k + 1 :, k] / pivot[:, None]
        left[:, k + 1 :] -= share * left[:, k, None]
        rest[:, k + 1 :] -= share[:, :, None] * rest[:, k, None, :]
    return total
