"""Exact combinations are found and named; honest columns stay, however near."""

from __future__ import annotations

import numpy as np
import pytest

from beforehand.fit.dependence import dependence, independent_of
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.sweeping import DEPENDENCE_TOLERANCE


def held(columns):
    """Moments of plain arrays, by name."""
    arrays = {named(name): np.asarray(values, float) for name, values in columns.items()}
    return moments_of(ArraySource(arrays), list(arrays))


def told(columns, names, *, intercept=True):
    """What depends on what, in plain names; None stands for the intercept."""
    found = dependence(held(columns), [named(name) for name in names], intercept=intercept)
    if found is None:
        return None
    return (
        found.key.factors[0].column,
        {None if key is None else key.factors[0].column: weight for key, weight in found.weights},
    )


@pytest.mark.parametrize("scale", [1e-200, 1e-6, 1.0, 1e6, 1e200])
def test_an_exact_combination_is_named_with_its_equation(scale):
    """An equation c = 2 a - 3 b + 5, whatever its unit; the first such column in the order given."""
    rng = np.random.default_rng(15)
    a, b = rng.normal(size=30), rng.normal(size=30)
    columns = {"a": a, "b": b, "other": rng.normal(size=30), "c": (2 * a - 3 * b + 5) * scale}
    name, weights = told(columns, ["a", "b", "other", "c"])
    assert name == "c"
    assert weights == pytest.approx({"a": 2 * scale, "b": -3 * scale, None: 5 * scale}, rel=1e-9)
    name, weights = told(columns, ["c", "a", "b"])
    assert name == "b"
    assert weights == pytest.approx({"a": 2 / 3, "c": -1 / 3 / scale, None: 5 / 3}, rel=1e-9)


def test_shares_that_add_to_a_hundred():
    """Shares rounded to doubles depend on each other only with an intercept."""
    rng = np.random.default_rng(16)
    parts = rng.dirichlet([1, 2, 3], size=40) * 100
    columns = {"a": parts[:, 0], "b": parts[:, 1], "c": 100 - parts[:, 0] - parts[:, 1]}
    assert told(columns, "abc") == ("c", {"a": -1.0, "b": -1.0, None: 100.0})
    assert told(columns, "abc", intercept=False) is None


def test_a_combination_without_a_constant_names_none():
    """A sum c = a + b has no constant in its equation, nor columns that have no part in it."""
    rng = np.random.default_rng(17)
    a, b = rng.normal(size=30) + 100, rng.normal(size=30) * 1e5
    columns = {"a": a, "z": rng.normal(size=30), "b": b, "c": a + b}
    assert told(columns, ["a", "z", "b", "c"]) == ("c", {"a": 1.0, "b": 1.0})
    assert told(columns, ["a", "z", "b", "c"], intercept=False) == ("c", {"a": 1.0, "b": 1.0})


def test_constants_and_zeros():
    """A constant is the intercept times its value; zeros are no combination of anything but themselves."""
    columns = {"x": [1.0, 2, 3, 5], "same": [0.3] * 4, "zero": [0.0] * 4}
    assert told(columns, ["x", "same"]) == ("same", {None: 0.3})
    assert told(columns, ["x", "same"], intercept=False) is None
    assert told(columns, ["zero", "x"]) == ("zero", {None: 0.0})
    assert told(columns, ["zero", "x"], intercept=False) == ("zero", {})
    assert told(columns, []) is None


def test_too_few_rows_are_a_dependence():
    """The third column of three rows is a combination of the intercept and the two before."""
    columns = {"a": [1.0, 2, 4], "b": [1.0, 0, 0], "c": [5.0, 7, 1]}
    assert told(columns, "ab") is None
    assert told(columns, "abc")[0] == "c"


@pytest.mark.parametrize("share", [1e-6, 1e-10, 1e-12])
def test_honest_near_dependence_stays(share):
    """A column that differs by a ten-billionth is honest: it stays."""
    rng = np.random.default_rng(18)
    a, b = rng.normal(size=30), rng.normal(size=30)
    columns = {"a": a, "b": b, "c": a + b + share * rng.normal(size=30)}
    assert told(columns, "abc") is None


def test_the_relative_pivot_says_how_near():
    """The share of its length that is left of a dependent column is rounding only."""
    rng = np.random.default_rng(19)
    a, b = rng.normal(size=30), rng.normal(size=30)
    found = dependence(held({"a": a, "b": b, "c": a + b / 3}), [named(n) for n in "abc"], intercept=True)
    assert 0 < found.relative_pivot < 1e-15 < DEPENDENCE_TOLERANCE


def test_independent_columns_are_those_that_stay():
    """Each column that depends on the ones before leaves, the others stay in order."""
    rng = np.random.default_rng(21)
    a, b, d = rng.normal(size=(3, 30))
    columns = {"same": np.ones(30), "a": a, "b": b, "c": a - b, "d": d, "e": 2 * d + 7, "f": d * d}
    keys = [named(name) for name in columns]
    kept = independent_of(held(columns), keys, intercept=True)
    assert [key.factors[0].column for key in kept] == ["a", "b", "d", "f"]
    kept = independent_of(held(columns), keys, intercept=False)
    assert [key.factors[0].column for key in kept] == ["same", "a", "b", "d", "f"]
    assert independent_of(held(columns), [], intercept=True) == ()
