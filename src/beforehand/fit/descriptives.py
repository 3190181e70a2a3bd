"""What one numeric column looks like: place, spread and shape, the same for every order of rows."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from beforehand.fit.columns import FloatArray
from beforehand.fit.sums import exact_mean


@dataclass(frozen=True, slots=True, kw_only=True)
class Descriptives:
    """Summary of the cells of a numeric column that are not missing, in the column's unit.

    Attributes
    ----------
    n, missing : int
        Cells with a value, and without.
    mean, sd : float or None
        ``sd`` with divisor n - 1; None for fewer than two values.
    minimum, lower_quartile, median, upper_quartile, maximum : float or None
        Quartiles by linear interpolation between order statistics (Hyndman & Fan 1996, definition
        7). None where there is no value.
    skewness, kurtosis : float or None
        Standardized third and fourth moments with divisor n; the kurtosis of a normal column is 3.
        None for a constant column.
    """

    n: int
    missing: int
    mean: float | None
    sd: float | None
    minimum: float | None
    lower_quartile: float | None
    median: float | None
    upper_quartile: float | None
    maximum: float | None
    skewness: float | None
    kurtosis: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Shape:
    """Central moments of a sample, scaled by a power of two.

    ``scale`` is the power of two by which deviations were divided, so that no power of them over-
    or underflows; ``second``, ``third``, ``fourth`` are their mean powers with divisor n.
    """

    n: int
    mean: float
    scale: float
    second: float
    third: float
    fourth: float

    @property
    def constant(self) -> bool:
        """Whether all values are equal."""
        return self.second == 0.0

    @property
    def sd(self) -> float:
        """Standard deviation with divisor n - 1; n must be at least 2."""
        return self.scale * math.sqrt(self.second * self.n / (self.n - 1))

    @property
    def skewness(self) -> float:
        """Third standardized moment, divisor n."""
        return self.third / (self.second * math.sqrt(self.second))

    @property
    def kurtosis(self) -> float:
        """Fourth standardized moment, divisor n; 3 for a normal sample."""
        return self.fourth / (self.second * self.second)


def shape_of(values: FloatArray) -> Shape:
    """Central moments of ``values``, shape ``(n,)``, finite, n at least 1, by exactly rounded sums."""
    n = len(values)
    _, exponent = math.frexp(float(np.abs(values).max()))
    # Halved twice, so that the sum of two values of opposite sign cannot overflow.
    unit = math.ldexp(1.0, -exponent - 1) if exponent > -1000 else 1.0
    scaled = values * unit
    centre = exact_mean(scaled)
    deviation = scaled - centre
    _, exponent = math.frexp(float(np.abs(deviation).max()))
    if values.min() == values.max():
        return Shape(n=n, mean=float(values[0]), scale=1.0, second=0.0, third=0.0, fourth=0.0)
    deviation = np.ldexp(deviation, -exponent)
    # The rounded mean leaves a small mean deviation behind (Chan, Golub, LeVeque 1983).
    rest = exact_mean(deviation)
    square = deviation * deviation
    second = exact_mean(square) - rest * rest
    third = exact_mean(square * deviation) - 3.0 * rest * second - rest**3
    fourth = exact_mean(square * square) - 4.0 * rest * third - 6.0 * rest * rest * second - rest**4
    return Shape(
        n=n,
        mean=centre / unit,
        scale=math.ldexp(1.0, exponent) / unit,
        second=second,
        third=third,
        fourth=fourth,
    )


def describe(values: FloatArray) -> Descriptives:
    """Describe a numeric column.

    Parameters
    ----------
    values : FloatArray
        Shape ``(n_rows,)``; NaN marks a missing cell, all else is finite.
    """
    present = values[~np.isnan(values)]
    n, missing = len(present), len(values) - len(present)
    if n == 0:
        return Descriptives(
            n=0, missing=missing, mean=None, sd=None, minimum=None, lower_quartile=None, median=None,
            upper_quartile=None, maximum=None, skewness=None, kurtosis=None,
        )  # fmt: skip
    shape = shape_of(present)
    minimum, lower, median, upper, maximum = quantiles(present, (0, 1, 2, 3, 4))
    return Descriptives(
        n=n,
        missing=missing,
        mean=shape.mean,
        sd=shape.sd if n > 1 else None,
        minimum=minimum,
        lower_quartile=lower,
        median=median,
        upper_quartile=upper,
        maximum=maximum,
        skewness=None if shape.constant else shape.skewness,
        kurtosis=None if shape.constant else shape.kurtosis,
    )


def quantiles(values: FloatArray, quarters: tuple[int, ...]) -> tuple[float, ...]:
    """Quantiles at whole quarters (0 the minimum, 4 the maximum), Hyndman & Fan's definition 7.

    Parameters
    ----------
    values : FloatArray
        Shape ``(n,)``, finite, n at least 1.
    """
    last = len(values) - 1
    places = [divmod(last * quarter, 4) for quarter in quarters]
    wanted = sorted({min(place + step, last) for place, _ in places for step in (0, 1)})
    # Adding 0.0 turns -0.0 into 0.0: the two compare equal, so which one a sort puts first is chance.
    ordered = np.partition(values + 0.0, wanted)
    found: list[float] = []
    for place, part in places:
        below = float(ordered[place])
        if part:
            above = float(ordered[place + 1])
            # Weighted, not stepped, so that two huge values of opposite sign do not overflow.
            below = below * (1.0 - part / 4.0) + above * (part / 4.0) if below != above else below
        found.append(below)
    return tuple(found)
