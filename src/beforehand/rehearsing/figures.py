"""Figures of a rehearsal, each with its Monte Carlo standard error.

The error says by how much another seed would move a figure, and nothing about the table or the plan.
Sums are taken exactly rounded, so that a figure does not hang on the order of the replicates.
"""

from __future__ import annotations

from collections.abc import Callable
from math import fsum, isfinite, sqrt

import numpy as np
from numpy.typing import ArrayLike
from pydantic import Field

from beforehand.lock.record import Figure, Record
from beforehand.rehearsing.trials import Flags, FloatArray

# Groups of replicates that are left out one at a time for an error without a formula: enough that
# the error itself is known to about a tenth (its relative error is 1/sqrt(2 (groups - 1))).
JACKKNIFE_GROUPS = 50


class Estimate(Record):
    """A figure and its Monte Carlo standard error."""

    value: Figure = Field(description="The figure.")
    mc_error: Figure | None = Field(
        description="Its Monte Carlo standard error; null where a single replicate shows none."
    )


def known(values: ArrayLike) -> FloatArray:
    """Those of the values that are finite, in their order.

    Parameters
    ----------
    values : array_like, shape (B,)

    Returns
    -------
    FloatArray, shape (at most B,)
    """
    array = np.asarray(values, dtype=float)
    finite: FloatArray = array[np.isfinite(array)]
    return finite


def share(count: int, of: int) -> Estimate | None:
    """A share of replicates with its binomial error.

    Parameters
    ----------
    count, of : int
        Of how many replicates how many; None where ``of`` is 0.

    Returns
    -------
    Estimate or None
        Where the count is none or all, the error is that of (count + 1)/(of + 2), as that of the share
        itself would be 0 however few the replicates.
    """
    if of == 0:
        return None
    value = count / of
    spread = value if 0 < count < of else (count + 1) / (of + 2)
    return Estimate(value=value, mc_error=sqrt(spread * (1 - spread) / of))


def proportion(flags: Flags) -> Estimate | None:
    """The share of True; None of nothing. ``flags`` has shape (B,)."""
    return share(int(np.count_nonzero(flags)), len(flags))


def tail_share(count: int, of: int) -> Estimate:
    """The p-value of an observation beside simulated ones, of which ``count`` are at least as extreme.

    The observation counts as one of its own replicates, (x + 1)/(B + 1), so that no finite number of
    replicates gives a p of 0 (Davison & Hinkley 1997, ch. 4).
    """
    value = (count + 1) / (of + 1)
    spread = (count + 1) / (of + 2)
    return Estimate(value=value, mc_error=sqrt(spread * (1 - spread) / max(of, 1)))


def mean(values: ArrayLike) -> Estimate | None:
    """The mean of the finite values with the error sd/√n; None where there is none."""
    array = known(values)
    count = len(array)
    if count == 0:
        return None
    value = _mean(array)
    return Estimate(value=value, mc_error=None if count == 1 else _sd(array, value) / sqrt(count))


def quantile(values: ArrayLike, level: float, level_error: float = 0.0) -> Estimate | None:
    """A quantile of the finite values.

    Parameters
    ----------
    values : array_like, shape (B,)
    level : float
        Between 0 and 1.
    level_error : float
        Standard error of the level itself, where it was estimated.

    Returns
    -------
    Estimate or None
        The quantile by linear interpolation. Its error is half the distance of the order statistics
        one standard error of the level below and above it; None of nothing.
    """
    array = known(values)
    count = len(array)
    if count == 0:
        return None
    value = float(np.quantile(array, level))
    step = sqrt(level * (1 - level) / count + level_error**2)
    low, high = max(0.0, level - step), min(1.0, level + step)
    if count == 1 or high == low:
        return Estimate(value=value, mc_error=None)
    below, above = np.quantile(array, [low, high])
    # At the ends of the sample one side is cut off; what is left counts for its share.
    return Estimate(value=value, mc_error=float(above - below) * step / (high - low))


def root_mean_square(values: ArrayLike, unit: float) -> Estimate | None:
    """The root of the mean square of the finite values, in units of ``unit``; error by the delta method."""
    squares = known(values) ** 2
    count = len(squares)
    if count == 0 or not (isfinite(unit) and unit > 0):
        return None
    level = _mean(squares)
    root = sqrt(level)
    if count == 1:
        return Estimate(value=root / unit, mc_error=None)
    error = 0.0 if root == 0 else _sd(squares, level) / sqrt(count) / (2 * root)
    return Estimate(value=root / unit, mc_error=error / unit)


def relative_bias(values: ArrayLike, truth: float) -> Estimate | None:
    """By which share of ``truth`` the mean of the finite values is off; None of nothing or without truth."""
    made = mean(values)
    if made is None or not isfinite(truth) or truth == 0:
        return None
    error = None if made.mc_error is None else made.mc_error / abs(truth)
    return Estimate(value=made.value / truth - 1, mc_error=error)


def jackknifed(statistic: Callable[[Flags], float], count: int) -> Estimate | None:
    """Any smooth statistic of replicates, with the error of the jackknife by groups.

    Parameters
    ----------
    statistic : callable
        From a mask of replicates, shape (count,), to the figure from those.
    count : int
        How many replicates there are.

    Returns
    -------
    Estimate or None
        None where the statistic is not finite. Groups are left out one at a time (Efron 1982, ch. 3);
        replicate b belongs to group b modulo their number.
    """
    value = statistic(np.ones(count, dtype=bool)) if count else float("nan")
    if not isfinite(value):
        return None
    groups = min(JACKKNIFE_GROUPS, count)
    if groups < 2:
        return Estimate(value=value, mc_error=None)
    group = np.arange(count) % groups
    without = np.array([statistic(group != one) for one in range(groups)])
    if not np.isfinite(without).all():
        return Estimate(value=value, mc_error=None)
    spread = fsum((without - _mean(without)) ** 2)
    return Estimate(value=value, mc_error=sqrt(spread * (groups - 1) / groups))


def shifted(estimate: Estimate | None, start: float) -> Estimate | None:
    """``start`` less an estimate, where ``start`` is known without error."""
    if estimate is None or not isfinite(start):
        return None
    return Estimate(value=start - estimate.value, mc_error=estimate.mc_error)


def _mean(array: FloatArray) -> float:
    """The exactly rounded sum over the count."""
    return fsum(array) / len(array)


def _sd(array: FloatArray, centre: float) -> float:
    """The standard deviation about the mean of at least two values."""
    return sqrt(fsum((array - centre) ** 2) / (len(array) - 1))
