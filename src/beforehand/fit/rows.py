"""Fitted values, residuals and leverages of every row, the same on every machine."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from beforehand.fit.columns import FloatArray, Source
from beforehand.fit.linear import evaluated, forms_of
from beforehand.fit.sums import exact_sum
from beforehand.fit.tableau import Tableau

# Leverages are wanted to so many bits after the point.
LEVERAGE_BITS = 56

# A row whose leverage is nearer to 1 is looked at in exact arithmetic.
NEAR_ONE = 1e-6


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RowValues:
    """Values of a fit row by row.

    Attributes
    ----------
    fitted, residual : FloatArray, shape (n,)
        In units of the outcome.
    leverage : FloatArray, shape (n,)
        Between 0 and 1.
    press : float or None
        Sum of squared leave-one-out residuals (Allen 1974); None where a leverage is 1.
    """

    fitted: FloatArray
    residual: FloatArray
    leverage: FloatArray
    press: float | None


def row_values(source: Source, tableau: Tableau) -> RowValues:
    """Fitted values, residuals and leverages over all rows of a source.

    Parameters
    ----------
    source : Source
        The rows of the fit.
    tableau : Tableau
        Swept model on the same rows.

    Returns
    -------
    RowValues
        Its arrays do not depend on the order of rows, nor on blocks or threads.
    """
    n = source.n_rows
    outcome = np.concatenate(
        [source.read(tableau.outcome, at, min(at + 65536, n)) for at in range(0, n, 65536)]
    )
    residual = _residuals(source, tableau)
    leverage = _leverages(source, tableau)
    rest = 1.0 - leverage
    press = None if bool((rest <= 0.0).any()) else exact_sum((residual / rest) ** 2)
    return RowValues(fitted=outcome - residual, residual=residual, leverage=leverage, press=press)


def _residuals(source: Source, tableau: Tableau) -> FloatArray:
    """Outcome less fitted value, as one linear form of the row."""
    keys = (tableau.outcome, *tableau.keys)
    weights = [[Fraction(1)], *([-tableau.slope(k)] for k in range(len(tableau.keys)))]
    forms = forms_of(keys, tableau.tops(keys), weights, [-tableau.constant])
    out = np.empty(source.n_rows)
    for start, stop, values in evaluated(source, forms):
        out[start:stop] = values[:, 0]
    return out


def _leverages(source: Source, tableau: Tableau) -> FloatArray:
    """Squared length of each row in the orthonormal basis of the design."""
    n = source.n_rows
    out = np.full(n, 1.0 / tableau.n if tableau.intercept else 0.0)
    if tableau.keys:
        weights, constants = tableau.whitening()
        forms = forms_of(
            tableau.keys, tableau.tops(tableau.keys), weights, constants, lowest_bit=-LEVERAGE_BITS
        )
        for start, stop, values in evaluated(source, forms):
            part = out[start:stop]
            # Column after column, so that the sum has one order only.
            for column in range(values.shape[1]):
                part += values[:, column] * values[:, column]
    for place in np.flatnonzero(out > 1.0 - NEAR_ONE).tolist():
        out[place] = _exact_leverage(source, tableau, place)
    return out


def _exact_leverage(source: Source, tableau: Tableau, place: int) -> float:
    """One leverage without rounding but the last; exactly 1.0 where the row alone makes a coefficient."""
    values = [Fraction(float(source.read(key, place, place + 1)[0])) for key in tableau.keys]
    leverage = tableau.leverage_of(values)
    return 1.0 if 1 - leverage <= Fraction(NEAR_ONE) ** 3 else float(leverage)
