"""Adjusted p values for a family of tests."""

from __future__ import annotations

from collections.abc import Sequence


def holm(p_values: Sequence[float]) -> tuple[float, ...]:
    """Step-down adjusted p values that hold the chance of any false find.

    Parameters
    ----------
    p_values : sequence of float
        One for each test of the family, each from 0 to 1, in any order.

    Returns
    -------
    tuple of float
        In the order given, at most 1: the largest of ``(m - j) p_(j)`` up to the test's own rank
        (Holm 1979, Scandinavian Journal of Statistics 6:65-70).

    Examples
    --------
    >>> holm([0.01, 0.04, 0.03])
    (0.03, 0.06, 0.06)
    """
    count = len(p_values)
    adjusted = [0.0] * count
    largest = 0.0
    for rank, test in enumerate(_ascending(p_values)):
        largest = max(largest, min(1.0, (count - rank) * p_values[test]))
        adjusted[test] = largest
    return tuple(adjusted)


def benjamini_hochberg(p_values: Sequence[float]) -> tuple[float, ...]:
    """Step-up adjusted p values that hold the expected share of false finds.

    Parameters
    ----------
    p_values : sequence of float
        One for each test of the family, each from 0 to 1, in any order.

    Returns
    -------
    tuple of float
        In the order given: the smallest of ``m p_(j) / j`` from the test's own rank on (Benjamini,
        Hochberg 1995, JRSS B 57:289-300, as adjusted p values).

    Examples
    --------
    >>> benjamini_hochberg([0.01, 0.04, 0.03])
    (0.03, 0.04, 0.04)
    """
    count = len(p_values)
    adjusted = [0.0] * count
    smallest = 1.0
    for rank, test in reversed(list(enumerate(_ascending(p_values)))):
        smallest = min(smallest, p_values[test] * count / (rank + 1))
        adjusted[test] = smallest
    return tuple(adjusted)


def _ascending(p_values: Sequence[float]) -> list[int]:
    """Positions by p, equal ones in the order given; refuses what is not a p value."""
    if not all(0.0 <= p <= 1.0 for p in p_values):
        raise ValueError("every p value must lie between 0 and 1")
    return sorted(range(len(p_values)), key=lambda test: p_values[test])
