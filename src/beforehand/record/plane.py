"""Points of a plane counted on a grid, with means in groups along it; the same for any order of rows.

Every value is a whole number of small parts of its range, so few that sums of them are exact in doubles
in whatever order they are added. One pass over the rows, block by block, finds all.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.columns import FloatArray
from beforehand.lock.pictures import CLOUD_COLUMNS, CLOUD_ROWS, LINE_POINTS, Cloud, Point

# Rows of one block: few enough to stay in a core's cache.
BLOCK = 32_768

# Groups of a line are joined from so many slices of the x axis, the narrower the better they are
# balanced where the values crowd.
SLICES = 384

# A value so large leaves no room for differences of it.
TOO_LARGE = 2.0**1000


@dataclass(frozen=True, slots=True)
class Plane:
    """Counted points.

    Attributes
    ----------
    cloud : Cloud
    line : tuple of points
        Means of x and y in groups along x: at most 24 groups of at least ``sqrt(n)`` points.
    width : tuple of points
        Mean of x and root mean square of y in the same groups.
    """

    cloud: Cloud
    line: tuple[Point, ...]
    width: tuple[Point, ...]


def plane_of(x: FloatArray, y: FloatArray, *, x_low: float | None = None) -> Plane | None:
    """Count points in the cells of a grid over their range.

    Parameters
    ----------
    x, y : FloatArray, shape (n,), finite
    x_low : float, optional
        Left edge, where it is not the smallest x.

    Returns
    -------
    Plane or None
        None for no points, or for values too large to tell apart.
    """
    if not len(x):
        return None
    left, right = edges_of(x)
    low, high = edges_of(y)
    left = left if x_low is None else x_low
    if not max(abs(left), abs(right), abs(low), abs(high)) < TOO_LARGE:
        return None
    bits = 52 - math.ceil(math.log2(len(x) + 1))
    part = 2.0**bits
    cells = np.zeros(CLOUD_COLUMNS * CLOUD_ROWS, dtype=np.intp)
    counts = np.zeros(SLICES, dtype=np.intp)
    # Sums of x, y and y squared over each slice, in parts of their range.
    sums = np.zeros((3, SLICES))
    for start in range(0, len(x), BLOCK):
        u = shares_of(x[start : start + BLOCK], left, right)
        v = shares_of(y[start : start + BLOCK], low, high)
        place = places_of(v, CLOUD_ROWS) * CLOUD_COLUMNS + places_of(u, CLOUD_COLUMNS)
        cells += np.bincount(place, minlength=len(cells))
        at = places_of(u, SLICES)
        counts += np.bincount(at, minlength=SLICES)
        for sum_, values in zip(sums, (u, v, v * v), strict=True):
            sum_ += np.bincount(at, weights=np.rint(values * part), minlength=SLICES)
    found = np.flatnonzero(cells)
    cloud = Cloud(
        x_low=left, x_high=right, y_low=low, y_high=high, columns=CLOUD_COLUMNS, rows=CLOUD_ROWS,
        cells=tuple((int(at % CLOUD_COLUMNS), int(at // CLOUD_COLUMNS), int(cells[at])) for at in found),
    )  # fmt: skip
    line, width = _lines(counts, sums / part, (left, right), (low, high))
    return Plane(cloud, line, width)


def edges_of(values: FloatArray) -> tuple[float, float]:
    """Smallest and largest value, drawn apart where they are one; never -0.0."""
    low, high = float(values.min()) + 0.0, float(values.max()) + 0.0
    if low == high:
        half = abs(low) / 2.0 or 0.5
        return low - half, high + half
    return low, high


def shares_of(values: FloatArray, low: float, high: float) -> FloatArray:
    """Where values lie between two edges: 0 at the lower, 1 at the upper."""
    if max(abs(low), abs(high)) >= TOO_LARGE:
        # Their difference could overflow.
        values, low, high = values / 4.0, low / 4.0, high / 4.0
    width = high - low
    shares = (values - low) / width if width > 0.0 else np.zeros(len(values))
    return np.asarray(np.clip(shares, 0.0, 1.0), dtype=np.float64)


def places_of(shares: FloatArray, count: int) -> NDArray[np.intp]:
    """In which of ``count`` parts of equal width each share lies; 1 in the last."""
    return np.minimum((shares * count).astype(np.intp), count - 1)


def _lines(
    counts: NDArray[np.intp], sums: FloatArray, x: tuple[float, float], y: tuple[float, float]
) -> tuple[tuple[Point, ...], tuple[Point, ...]]:
    """Means of groups of slices, taken back from shares to units."""
    groups = groups_of(counts)
    size = np.bincount(groups, weights=counts)
    u, v, squares = (np.bincount(groups, weights=row) / size for row in sums)
    wide, tall = x[1] - x[0], y[1] - y[0]
    line: list[Point] = []
    width: list[Point] = []
    for at in range(len(size)):
        place, mean = x[0] + wide * float(u[at]), y[0] + tall * float(v[at])
        square = y[0] * y[0] + 2.0 * y[0] * tall * float(v[at]) + tall * tall * float(squares[at])
        line.append((place, mean))
        width.append((place, math.sqrt(max(square, 0.0))))
    return tuple(line), tuple(width)


def groups_of(counts: NDArray[np.intp]) -> NDArray[np.intp]:
    """The group of each slice: neighbours are joined until a group has points enough."""
    n = int(counts.sum())
    enough = max(-(-n // LINE_POINTS), math.isqrt(n - 1) + 1)
    group = np.zeros(len(counts), dtype=np.intp)
    made, held, left = 0, 0, n
    for at, count in enumerate(counts.tolist()):
        group[at] = made
        held += count
        left -= count
        # What would be left over joins the last group.
        if held >= enough and left >= enough:
            made, held = made + 1, 0
    return group
