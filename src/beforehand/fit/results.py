"""What a fit gives back: frozen numbers, no methods that compute.

A number that does not exist (the t of an exact fit, the F of a mean model) is None, never NaN.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from beforehand.fit.columns import Key


@dataclass(frozen=True, slots=True, kw_only=True)
class Coefficient:
    """One estimated coefficient.

    Attributes
    ----------
    key : Key or None
        The design column; None for the intercept.
    estimate, standard_error : float
        In units of the outcome per unit of the column.
    t, p : float or None
        ``estimate / standard_error`` and its two-sided p on the residual degrees of freedom.
    """

    key: Key | None
    estimate: float
    standard_error: float
    t: float | None
    p: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class TermTest:
    """The test of one predictor as a whole: its t for one column, the partial F of its block.

    ``statistic`` is |t| for one column and F for a block; ``partial_f2`` is the observed effect
    size (R²_full - R²_without) / (1 - R²_full) (Cohen 1988, ch. 9).
    """

    predictor: str
    df: int
    statistic: float | None
    p: float | None
    partial_f2: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Fit:
    """One least-squares fit.

    Attributes
    ----------
    n, p : int
        Rows used, coefficients with the intercept.
    coefficients : tuple of Coefficient
        The intercept first where there is one, then in design order.
    tests : mapping of predictor name to TermTest
    rss, tss : float
        Residual and total sum of squares (about the mean with an intercept, about 0 without).
    r_squared, adjusted_r_squared, residual_sd : float
    f, f_p : float or None
        Test that all coefficients but the intercept are zero; ``f_df`` its degrees of freedom.
    aic, bic : float or None
        Gaussian likelihood, ``n log(2 pi rss / n) + n + 2 p`` and with ``p log n`` (the error
        variance is not counted as a parameter, as in statsmodels); None for an exact fit.
    exact : bool
        The residuals vanish to the precision of the table: no t, p or F exists.
    df_inference : int
        Degrees of freedom of t tests and intervals: ``df_residual``, or clusters less one.
    errors : str
        ``classical``, ``hc0`` to ``hc3``, ``cluster`` or ``autocorrelation``.
    """

    n: int
    p: int
    df_residual: int
    df_inference: int
    coefficients: tuple[Coefficient, ...]
    tests: Mapping[str, TermTest] = field(default_factory=dict)
    rss: float
    tss: float
    r_squared: float
    adjusted_r_squared: float
    residual_sd: float
    f: float | None
    f_df: tuple[int, int]
    f_p: float | None
    aic: float | None
    bic: float | None
    exact: bool = False
    errors: str = "classical"


@dataclass(frozen=True, slots=True, kw_only=True)
class Check:
    """One assumption check.

    Attributes
    ----------
    name : str
        ``curvature``, ``breusch_pagan`` (Koenker's studentized form), ``white``, ``reset``,
        ``jarque_bera``, ``shapiro_wilk``, ``durbin_watson``, ``breusch_godfrey``.
    statistic, p : float or None
    df : tuple of int
        Degrees of freedom of the reference distribution, empty where it has none.
    not_applicable : str
        Why the check could not be made; empty when it was.
    """

    name: str
    statistic: float | None
    p: float | None
    df: tuple[int, ...] = ()
    not_applicable: str = ""
