"""Exponents that the data teach: of a predictor by least squares, of an outcome by likelihood.

Both searches are given a function from a candidate exponent to the residual sum of squares of the
model under it, and ask for as few values as they can; they know nothing of tables.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from beforehand.faults import NumericalError

# Exponents beyond these are no longer ladders of powers but a wish for another model.
LOWEST, HIGHEST = -2.0, 2.0

# How far the interval of an outcome's exponent is followed.
INTERVAL_LOWEST, INTERVAL_HIGHEST = -5.0, 5.0

# Drop of the log-likelihood at the ends of the 95% interval: half the .95 point of chi-square(1).
LIKELIHOOD_DROP = 1.9207294103470616

# A maximum of a function known to 16 digits is known to 8: half of them.
_MAXIMUM_WIDTH = 1e-7
_CROSSING_WIDTH = 1e-9
_FIRST_STEP = 0.25  # first stride from the maximum to the end of the interval

_COARSE_STEP = 50  # hundredths
_GOLDEN = (math.sqrt(5.0) - 1.0) / 2.0


class NoExponent(NumericalError):  # noqa: N818 - named by what is so, as its neighbours are
    """No exponent can be learned from these rows."""

    code = "no_exponent"


RssOf = Callable[[float], float]


@dataclass(frozen=True, slots=True, kw_only=True)
class OutcomeExponent:
    """The Box-Cox exponent of an outcome.

    Attributes
    ----------
    exponent : float
        To two decimals: the one to apply.
    estimate : float
        Where the profile likelihood is largest.
    low, high : float or None
        Ends of the 95% interval; None where the likelihood has not dropped far enough within
        ``INTERVAL_LOWEST`` to ``INTERVAL_HIGHEST``.
    log_likelihood : float
        At the estimate, of the outcome in its own unit, less the constants.
    """

    exponent: float
    estimate: float
    low: float | None
    high: float | None
    log_likelihood: float


def predictor_exponent(rss_of: RssOf) -> float:
    """Exponent, to two decimals, under which a predictor leaves the least residual sum of squares.

    The idea is Box & Tidwell's (1962, Technometrics 4:531-550); the minimum is searched directly,
    as their iteration can step away from it. Of equal exponents the one nearest to 1, no change,
    is taken.

    Parameters
    ----------
    rss_of : callable
        Residual sum of squares of the working model with the predictor under that exponent;
        infinite where the model cannot be fitted.

    Returns
    -------
    float
        Within ``LOWEST`` and ``HIGHEST``.
    """
    seen: dict[int, float] = {}

    def rank(hundredths: int) -> tuple[float, int]:
        if hundredths not in seen:
            seen[hundredths] = rss_of(hundredths / 100.0)
        return seen[hundredths], abs(hundredths - 100)

    lowest, highest = round(100 * LOWEST), round(100 * HIGHEST)
    best = min(range(lowest, highest + 1, _COARSE_STEP), key=rank)
    low, high = max(best - _COARSE_STEP, lowest), min(best + _COARSE_STEP, highest)
    # Golden section on whole hundredths; the last few are all looked at.
    while high - low > 4:
        width = round((high - low) * _GOLDEN)
        first, second = high - width, low + width
        if first >= second:
            first, second = second - 1, second
        if rank(first) <= rank(second):
            high = second
        else:
            low = first
    found: int = min([*range(low, high + 1), best], key=rank)
    return found / 100.0


def outcome_exponent(rss_of: RssOf, *, n: int, log_total: float) -> OutcomeExponent:
    """Exponent of an outcome with the largest profile likelihood, and its 95% interval.

    Parameters
    ----------
    rss_of : callable
        Residual sum of squares of the model for ``(y^exponent - 1) / exponent``.
    n : int
        Rows.
    log_total : float
        Sum of the logarithms of the outcome.

    Returns
    -------
    OutcomeExponent
        By ``L = -n/2 log(RSS / n) + (exponent - 1) log_total`` (Box & Cox 1964, JRSS B 26:211-252,
        eq. 8); the interval is where L has dropped by no more than ``LIKELIHOOD_DROP``.

    Raises
    ------
    NoExponent
        When the model cannot be fitted under any exponent, or fits one exactly.
    """
    seen: dict[float, float] = {}

    def likelihood(exponent: float) -> float:
        if exponent not in seen:
            rss = rss_of(exponent)
            if not rss > 0.0:
                raise NoExponent(f"the outcome is fitted exactly under the exponent {exponent:g}")
            # Infinite where no fit exists: such an exponent is never the best.
            seen[exponent] = -0.5 * n * math.log(rss / n) + (exponent - 1.0) * log_total
        return seen[exponent]

    grid = [LOWEST + 0.5 * step for step in range(round(2 * (HIGHEST - LOWEST)) + 1)]
    start = max(grid, key=lambda exponent: (likelihood(exponent), -abs(exponent - 1.0)))
    if math.isinf(likelihood(start)):
        raise NoExponent("the outcome cannot be fitted under any exponent")
    estimate = _maximum(likelihood, max(start - 0.5, LOWEST), min(start + 0.5, HIGHEST))
    largest = likelihood(estimate)
    floor = largest - LIKELIHOOD_DROP
    return OutcomeExponent(
        exponent=round(estimate, 2) + 0.0,
        estimate=estimate,
        low=_crossing(likelihood, floor, estimate, INTERVAL_LOWEST),
        high=_crossing(likelihood, floor, estimate, INTERVAL_HIGHEST),
        log_likelihood=largest,
    )


def _maximum(height: RssOf, low: float, high: float) -> float:
    """Where ``height`` is largest between ``low`` and ``high``, by Brent's parabolas (1973, ch. 5)."""
    from scipy.optimize import minimize_scalar

    found = minimize_scalar(
        lambda exponent: -height(float(exponent)),
        bounds=(low, high),
        method="bounded",
        options={"xatol": _MAXIMUM_WIDTH},
    )
    return float(found.x)


def _crossing(height: RssOf, floor: float, inside: float, end: float) -> float | None:
    """Where ``height`` falls to ``floor`` between ``inside`` and ``end``; None when it does not."""
    from scipy.optimize import brentq

    step = math.copysign(_FIRST_STEP, end - inside)
    outside = inside
    while height(outside) > floor:
        if outside == end:
            return None
        inside, outside = outside, min(max(outside + step, INTERVAL_LOWEST), INTERVAL_HIGHEST)
        step *= 2.0
    if math.isinf(height(outside)):
        return None
    return float(
        brentq(lambda exponent: height(float(exponent)) - floor, inside, outside, xtol=_CROSSING_WIDTH)
    )
