"""The rungs of the ladder of powers: where each applies, what it does, how it is undone.

A rung replaces a column (Tukey 1977, Exploratory Data Analysis, ch. 3). It is never shifted to fit:
where a value lies outside its domain, the rung is not applicable, and the reason says why.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from beforehand.fit.columns import FloatArray
from beforehand.fit.elementary import cbrt, exp, expm1, log
from beforehand.fit.sums import exact_mean

IDENTITY = "identity"
BOX_COX = "box_cox"

_Condition = Callable[[FloatArray], "np.ndarray[tuple[int, ...], np.dtype[np.bool_]]"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Rung:
    """One rung.

    Attributes
    ----------
    forward, back : callable of (values, exponent)
        The rung and its inverse, elementwise; ``exponent`` means something to ``box_cox`` alone.
    outside : callable of values, or None
        Which values the rung cannot take; None when it takes all.
    complaint : str
        What such a value is called.
    two_to_one : bool
        Whether a value and its negative come to the same, so that there is no way back for
        negative values.
    """

    forward: Callable[[FloatArray, float], FloatArray]
    back: Callable[[FloatArray, float], FloatArray]
    outside: _Condition | None = None
    complaint: str = ""
    two_to_one: bool = False


def _box_cox(values: FloatArray, exponent: float) -> FloatArray:
    """``(values^exponent - 1) / exponent``, the logarithm at 0 (Box & Cox 1964, eq. 1)."""
    if exponent == 1.0:
        return values - 1.0
    if exponent == 0.0:
        return log(values)
    return expm1(exponent * log(values)) / exponent


def _box_cox_back(values: FloatArray, exponent: float) -> FloatArray:
    """Inverse of ``_box_cox``; NaN where ``exponent * values`` is -1 or less."""
    if exponent == 1.0:
        return values + 1.0
    if exponent == 0.0:
        return exp(values)
    return exp(log(1.0 + exponent * values) / exponent)


def _root_back(values: FloatArray, _: float) -> FloatArray:
    """Square of what a square root can be; NaN below 0."""
    return np.where(values >= 0.0, values * values, np.nan)


def _reciprocal_back(values: FloatArray, _: float) -> FloatArray:
    """Reciprocal; NaN at 0."""
    with np.errstate(divide="ignore"):
        return np.where(values != 0.0, 1.0 / values, np.nan)


RUNGS: Mapping[str, Rung] = {
    IDENTITY: Rung(forward=lambda x, _: x, back=lambda x, _: x),
    "square": Rung(forward=lambda x, _: x * x, back=lambda x, _: np.sqrt(x), two_to_one=True),
    "cube": Rung(forward=lambda x, _: x * x * x, back=lambda x, _: cbrt(x)),
    "square_root": Rung(
        forward=lambda x, _: np.sqrt(x),
        back=_root_back,
        outside=lambda x: x < 0.0,
        complaint="a negative value",
    ),
    "cube_root": Rung(forward=lambda x, _: cbrt(x), back=lambda x, _: x * x * x),
    "log": Rung(
        forward=lambda x, _: log(x),
        back=lambda x, _: exp(x),
        outside=lambda x: x <= 0.0,
        complaint="a value that is not positive",
    ),
    "reciprocal": Rung(
        forward=lambda x, _: 1.0 / x,
        back=_reciprocal_back,
        outside=lambda x: x == 0.0,
        complaint="0",
    ),
    BOX_COX: Rung(
        forward=_box_cox,
        back=_box_cox_back,
        outside=lambda x: x <= 0.0,
        complaint="a value that is not positive",
    ),
}


def domain(rung: str, values: FloatArray, *, exponent: float = 1.0, way_back: bool = False) -> str:
    """Why a rung cannot be applied to a column; empty when it can.

    Parameters
    ----------
    rung : str
        A name of ``RUNGS``.
    values : FloatArray
        Shape ``(n,)``; NaN, a missing cell, is outside no domain.
    way_back : bool
        Also ask that the rung can be undone, as for an outcome.

    Returns
    -------
    str
        For example ``square_root of a negative value in 3 rows``.

    Examples
    --------
    >>> domain("log", np.array([1.0, 0.0, -2.0]))
    'log of a value that is not positive in 2 rows'
    """
    asked = RUNGS[rung]
    if asked.outside is not None and (count := int(np.count_nonzero(asked.outside(values)))):
        return f"{rung} of {asked.complaint} in {_rows(count)}"
    if way_back and asked.two_to_one and (count := int(np.count_nonzero(values < 0.0))):
        return f"{rung} of a negative value cannot be undone, in {_rows(count)}"
    with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
        there = asked.forward(values, exponent)
    if count := int(np.count_nonzero(~np.isfinite(there) & np.isfinite(values))):
        return f"{rung} too large for a number in {_rows(count)}"
    return ""


def apply(rung: str, values: FloatArray, exponent: float = 1.0) -> FloatArray:
    """Values of a column under a rung; shape kept, NaN stays NaN.

    Ask ``domain`` first: outside it the result is NaN or infinite.

    Examples
    --------
    >>> apply("square_root", np.array([4.0, 9.0]))
    array([2., 3.])
    """
    with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
        return RUNGS[rung].forward(values, exponent)


def undo(rung: str, values: FloatArray, exponent: float = 1.0) -> FloatArray:
    """Values of a column back on their own scale; NaN where no value has this image.

    Examples
    --------
    >>> undo("log", np.array([0.0]))
    array([1.])
    """
    with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
        return RUNGS[rung].back(values, exponent)


@dataclass(frozen=True, slots=True, kw_only=True)
class Smearing:
    """Duan's estimate of a mean on the outcome's own scale.

    Attributes
    ----------
    mean : float or None
        In the outcome's unit; None when there is none.
    not_applicable : str
        Why not; empty when there is one.
    """

    mean: float | None
    not_applicable: str = ""


def smeared(rung: str, at: float, residuals: FloatArray, exponent: float = 1.0) -> Smearing:
    """Mean outcome, in its own unit, where the transformed outcome is expected to be ``at``.

    Parameters
    ----------
    rung : str
        The rung on which the outcome was fitted.
    at : float
        A fitted value on that rung.
    residuals : FloatArray
        Shape ``(n,)``, of the fit, on that rung.

    Returns
    -------
    Smearing
        The mean over the residuals of the undone sum (Duan 1983, JASA 78:605-610, eq. 2.4).
    """
    back = undo(rung, at + residuals, exponent)
    if count := int(np.count_nonzero(~np.isfinite(back))):
        return Smearing(
            mean=None,
            not_applicable=f"fitted value plus residual is outside the range of {rung} in {_rows(count)}",
        )
    return Smearing(mean=exact_mean(back))


def smearing_factor(residuals: FloatArray) -> float:
    """Factor on ``exp(fitted)`` for an outcome fitted on ``log``: the mean of ``exp(residual)``."""
    return exact_mean(exp(residuals))


def _rows(count: int) -> str:
    """``1 row``, ``2 rows``."""
    return "1 row" if count == 1 else f"{count} rows"
