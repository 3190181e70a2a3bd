"""Logarithm, exponential and cube root against mpmath."""

from __future__ import annotations

import math
from collections.abc import Callable

import mpmath
import numpy as np
import pytest

from beforehand.fit import elementary

EDGES = [5e-324, 2.3e-308, 1e-300, 0.5, math.sqrt(0.5), 1.0, 1.0 + 2**-52, 1.0 - 2**-53, 2.0, 1e300, 1.7e308]


def worst_error(found: np.ndarray, true: Callable[[mpmath.mpf], mpmath.mpf], at: np.ndarray) -> float:
    """Largest error in units of the last place."""
    with mpmath.workprec(200):
        errors = []
        for value, argument in zip(found.tolist(), at.tolist(), strict=True):
            exact = true(mpmath.mpf(argument))
            errors.append(abs(value - exact) / math.ulp(float(exact)))
        return float(max(errors))


def test_log() -> None:
    """The logarithm is right to two units in the last place, near 1 as well."""
    random = np.random.default_rng(41)
    at = np.concatenate([np.exp(random.normal(size=2000) * 30), 1 + random.normal(size=500) * 1e-3, EDGES])
    assert worst_error(elementary.log(at), mpmath.log, at) < 2.0
    assert elementary.log(np.array([1.0])).tolist() == [0.0]


def test_exp_and_expm1() -> None:
    """The exponential is right to one unit, that less 1 to two, near 0 as well."""
    random = np.random.default_rng(42)
    at = np.concatenate(
        [random.uniform(-700, 700, 1500), random.normal(size=1000) * 1e-3, [1e-17, -1e-17, 1e-300]]
    )
    assert worst_error(elementary.exp(at), mpmath.exp, at) < 1.0
    assert worst_error(elementary.expm1(at), mpmath.expm1, at) < 2.0


def test_cbrt() -> None:
    """The cube root is the nearest double, for either sign and at the ends of the range."""
    random = np.random.default_rng(43)
    at = np.concatenate([np.exp(random.normal(size=2000) * 100), EDGES])
    assert worst_error(elementary.cbrt(at), mpmath.cbrt, at) <= 0.5
    assert np.array_equal(elementary.cbrt(-at), -elementary.cbrt(at))
    assert elementary.cbrt(np.arange(-50.0, 50.0) ** 3).tolist() == list(range(-50, 50))


def test_cbrt_does_not_hang_on_the_library_start(monkeypatch: pytest.MonkeyPatch) -> None:
    """A start that is a unit in the last place off comes to the same root."""
    at = np.exp(np.random.default_rng(44).normal(size=2000) * 3)
    found = elementary.cbrt(at)
    library = np.cbrt
    monkeypatch.setattr(np, "cbrt", lambda x: np.nextafter(library(x), np.inf))
    assert np.array_equal(elementary.cbrt(at), found)


def test_outside_the_range() -> None:
    """Where a function has no value the result says so in the way of IEEE 754."""
    assert str(elementary.log(np.array([0.0, -1.0, np.nan, np.inf]))) == "[-inf  nan  nan  inf]"
    assert str(elementary.exp(np.array([-800.0, 800.0, np.nan]))) == "[ 0. inf nan]"
    assert str(elementary.expm1(np.array([-800.0, 800.0, np.nan]))) == "[-1. inf nan]"
    assert str(elementary.cbrt(np.array([0.0, np.nan]))) == "[ 0. nan]"
